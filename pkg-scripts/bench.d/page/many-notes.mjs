// What 1 000 notes do to the page's main thread, as a person would use it: choose a table, unfold the pile, answer, take the result.

/** Watches how long two frames are apart. */
function watch() {
  const seen = { longest: 0, last: performance.now() };
  const tick = (now) => {
    seen.longest = Math.max(seen.longest, now - seen.last);
    seen.last = now;
    requestAnimationFrame(tick);
  };
  requestAnimationFrame(tick);
  window.longestGap = () => {
    const { longest } = seen;
    seen.longest = 0;
    return longest;
  };
}

/** The tasks of the page's main thread in a trace: by the clock, and in time that the thread had a core. Milliseconds. */
function mainTasks(trace, path) {
  const { traceEvents } = JSON.parse(trace);
  const thread = (event) => `${event.pid}/${event.tid}`;
  const mains = traceEvents.filter(({ name, args }) => name === "thread_name" && args.name === "CrRendererMain").map(thread);
  const tasks = traceEvents.filter((event) => event.name === "RunTask" || event.name === "ThreadControllerImpl::RunTask").filter((event) => mains.includes(thread(event)));
  const most = (times) => Math.max(0, ...times.filter(Number.isFinite)) / 1000;
  if (tasks.length === 0) throw new Error(`${path}: the trace has no task of the page`);
  return { longestTask: most(tasks.map(({ dur }) => dur)), longestTaskCpu: most(tasks.map(({ tdur }) => tdur)), tasksOver50: tasks.filter(({ dur }) => dur > 50_000).length };
}

const quoted = (cell) => `"${cell.replaceAll('"', '""')}"`;

/** `notes`: text and tray of each. Times in milliseconds, by phase. */
export async function manyNotes(browser, origin, { notes, answers }) {
  const context = await browser.newContext({ viewport: { width: 1280, height: 800 } });
  const page = await context.newPage();
  await page.addInitScript(watch);
  await page.goto(origin, { waitUntil: "networkidle" });
  const phases = {};
  const phase = async (name, act) => {
    await page.evaluate(() => window.longestGap());
    await browser.startTracing(page, { categories: ["toplevel", "devtools.timeline"] });
    await act();
    await page.waitForTimeout(300);
    phases[name] = { ...mainTasks(await browser.stopTracing(), name), longestGap: await page.evaluate(() => window.longestGap()) };
  };
  const inHand = page.locator("ken-question .mat .text");
  const table = ["number,note", ...notes.map(({ text }, at) => `${at + 1},${quoted(text)}`)].join("\r\n");
  let seconds = 0;
  await phase("reading all notes", async () => {
    const chooser = page.waitForEvent("filechooser");
    await page.getByRole("button", { name: "Choose notes" }).click();
    await (await chooser).setFiles([{ name: "notes.csv", mimeType: "text/csv", buffer: Buffer.from(table) }]);
    await page.getByRole("button", { name: /^Add [\d,]+ notes$/ }).click();
    const began = Date.now();
    await page.getByRole("status").filter({ hasText: /notes added/ }).waitFor({ state: "attached", timeout: 1_200_000 });
    seconds = (Date.now() - began) / 1000;
  });
  await phase("unfolding the unsorted pile", () => page.getByRole("button", { name: /^Show [\d,]+ more in/ }).click());
  const unfolded = await page.locator("ken-shelves .tile").count();
  await phase("folding it again", () => page.getByRole("button", { name: "Show fewer" }).click());
  const trayOf = new Map(notes.map(({ text, tray }) => [text.trim(), tray]));
  await phase(`${answers} answers`, async () => {
    for (let given = 0; given < answers; given++) {
      const text = ((await inHand.textContent()) ?? "").trim();
      const trays = await page.locator("ken-question .rows .label").allTextContents();
      const tray = trayOf.get(text);
      if (tray === undefined) throw new Error(`a note in hand that was not given: ${text}`);
      if (trays.indexOf(tray) >= 0 && trays.indexOf(tray) < 10) await page.keyboard.press(String((trays.indexOf(tray) + 1) % 10));
      else {
        await page.keyboard.press("t");
        await page.keyboard.type(tray);
        await page.keyboard.press("Enter");
      }
      for (let tries = 0; tries < 2000 && ((await inHand.textContent()) ?? "").trim() === text; tries++) await page.waitForTimeout(5);
    }
  });
  const answerTimes = await page.evaluate(() => performance.getEntriesByName("answer to sorted pile").map(({ duration }) => duration));
  // The shelf with the most behind it.
  const more = page.getByRole("button", { name: /^Show [\d,]+ more in/ });
  const hidden = await more.evaluateAll((all) => all.map((one) => Number(/[\d,]+/.exec(one.ariaLabel)[0].replace(",", ""))));
  await phase("unfolding the fullest shelf", () => more.nth(hidden.indexOf(Math.max(...hidden))).click());
  await phase("undoing with that shelf unfolded", () => page.keyboard.press("u"));
  await phase("taking the result", async () => {
    const download = page.waitForEvent("download");
    await page.getByRole("button", { name: "Take result" }).click();
    await download;
  });
  await phase("opening the page again", async () => {
    await page.reload({ waitUntil: "networkidle" });
    await inHand.waitFor();
  });
  await context.close();
  return { notes: notes.length, answers, unfolded, seconds, answerTimes, phases };
}
