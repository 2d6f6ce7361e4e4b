/** All that the page says, in one place. */
import type { Kind } from '../kit/client';

const whole = new Intl.NumberFormat('en');
const share = new Intl.NumberFormat('en', { style: 'percent', maximumFractionDigits: 0 });

export const count = (n: number): string => whole.format(n);
export const percent = (fraction: number): string => share.format(fraction);

/** As few digits as an estimate has a right to. */
function about(n: number): string {
  return count(n < 20 ? Math.round(n) : Number(n.toPrecision(n < 100 ? 1 : 2)) || 0);
}

function percentRange(low: number, high: number): string {
  return `${percent(low).replace(/\s?%$/, '')}–${percent(high)}`;
}

function photos(n: number): string {
  return n === 1 ? '1 photo' : `${count(n)} photos`;
}

function notes(n: number): string {
  return n === 1 ? '1 note' : `${count(n)} notes`;
}

function rows(n: number): string {
  return n === 1 ? '1 row' : `${count(n)} rows`;
}

function items(n: number, kind: Kind): string {
  return kind === 'notes' ? notes(n) : photos(n);
}

function megabytes(bytes: number): string {
  return (bytes / 1e6).toFixed(1);
}

function answers(n: number): string {
  return n === 1 ? '1 answer' : `${count(n)} answers`;
}

function trays(n: number): string {
  return n === 1 ? '1 tray' : `${count(n)} trays`;
}

function piles(n: number): string {
  return n === 1 ? '1 pile' : `${count(n)} piles`;
}

const moment = new Intl.DateTimeFormat('en-GB', { dateStyle: 'medium', timeStyle: 'short' });
const date = (at: number): string => moment.format(at);

function timeLeft(seconds: number): string {
  if (seconds < 5) return 'a few seconds left';
  if (seconds < 90) return `about ${count(Math.ceil(seconds / 5) * 5)} s left`;
  if (seconds < 5400) return `about ${count(Math.ceil(seconds / 60))} min left`;
  return `about ${count(Math.ceil(seconds / 3600))} h left`;
}

const undone: Record<string, string> = {
  answer: 'an answer',
  none: '“none of these”',
  skip: '“can’t tell”',
  withdraw: 'taking an answer back',
  'add-tray': 'a new tray',
  'rename-tray': 'a new name',
  'merge-trays': 'putting two trays together',
  'remove-tray': 'taking a tray away',
  'remove-item': 'taking an item out',
  keep: 'leaving a doubted answer',
  'spot-check': 'the answers of a spot check',
};

export const words = {
  brand: 'Kenspeckle',
  title: (kit: string | undefined) => (kit ? `${kit} – Kenspeckle` : 'Kenspeckle: show a few, the rest sorts itself'),

  // The empty page
  promise: ['Show a few.', 'The rest sorts itself.'],
  job: 'For a pile of photos or notes and categories that exist only in your head. Say for a handful where they belong. After every answer the whole pile sorts itself anew, and shows you where it is unsure.',
  demo: 'Try the demo pile',
  demoLoading: 'Fetching the demo pile …',
  demoNotes: 'Try the demo notes',
  demoNotesLoading: 'Fetching the demo notes …',
  demoMissing: 'The demo pile can’t be loaded. It needs the network once; then it works without.',
  chooseFiles: 'Choose photos',
  chooseFolder: 'Choose a folder',
  chooseNotes: 'Choose notes',
  writeNotes: 'Paste notes',
  camera: 'Take pictures',
  dropHint: 'Or drop photos, a folder or files of notes (.txt, .csv, .tsv, .jsonl) anywhere on this page, or paste.',
  private: 'Nothing leaves this device.',
  privateLong: 'Reading, sorting and keeping all happen in this browser. Once loaded, the page works without a network.',
  dropNow: 'Let go to add to the pile',

  // In hand
  question: 'Which tray?',
  yourAnswer: (tray: string) => `You put it in ${tray}`,
  yourNone: 'You set it aside',
  askedEarlier: 'You couldn’t tell',
  guess: 'sorter’s guess',
  plausible: 'plausible',
  setAsideSince: (reason: string) => `Set aside by the sorter: ${reason}.`,
  nothingPlausible: 'No tray is as probable as usual: it may be something new.',
  findTray: 'Name a new tray, or find one',
  firstTray: 'Name the tray it belongs in',
  firstTrayHint: 'Any name you would write on a label. Then Enter.',
  secondTrayHint: 'The same tray? Press 1. Another one? Name it: with two trays the pile begins to sort itself.',
  newTray: (name: string) => `New tray “${name}”`,
  none: 'None of these',
  cantTell: 'Can’t tell',
  zoom: 'Zoom',
  backToQuestion: 'Back to the question',
  withdraw: 'Take answer back',
  nothingToAsk: 'Nothing left to ask',
  nothingToAskHint: 'Look along the front edges of the shelves. Then take the result.',
  choices: 'Trays',

  // Strips of look-alikes
  stripQuestion: (tray: string) => `All in ${tray}?`,
  stripHint: 'Look at each. Take out the odd ones.',
  strip: (kind: Kind, n: number, tray: string) => `${items(n, kind)} that may all belong in ${tray}`,
  takeOut: (name: string) => `Take out ${name}`,
  stripCount: (kind: Kind, staying: number, out: number) => `${items(staying, kind)}${out === 0 ? '' : `, ${count(out)} taken out`}`,
  stripGuess: (staying: number) => (staying === 0 ? 'all are taken out' : `these ${count(staying)}`),
  stripNone: 'First lead to one of the strip, with the arrows or a tap: then “none of these” and “can’t tell” are about that one.',
  stripLeft: 'All taken out. They are asked about next.',
  oneAtATime: 'One at a time',
  together: (n: number) => `${count(n)} look-alikes at once`,

  // Shelves
  shelves: 'Shelves',
  pile: 'The pile',
  pileHint: 'not sorted yet',
  aside: 'Set aside',
  asideHint: 'in no tray',
  asideBySorter: 'Set aside by the sorter',
  bySorter: 'by the sorter',
  /** By number of the reason. */
  reasons: ['', 'unlike anything shown', 'between trays', 'too little to judge by'],
  reasonsShort: ['', 'unlike', 'between', 'too little'],
  sureOf: (tray: string) => `${tray}: sure`,
  unsureOf: (tray: string) => `${tray}: unsure, least sure first`,
  unsure: 'unsure',
  emptyTray: 'Nothing here yet',
  more: [(n: number) => `+${count(n)}`, ' more'] as const,
  moreLong: (n: number, tray: string) => `Show ${count(n)} more in ${tray}`,
  fewer: 'Show fewer',
  tile: (name: string, tray: string, how: string) => `${name}, ${tray}, ${how}`,
  tileInHand: (text: string, how: string) => `${text}\n(${how})`,
  howAnswered: 'your answer',
  howSure: (probability: number, others: readonly string[]) =>
    `${percent(probability)} sure${others.length > 0 ? `; ${others.join(', ')} plausible too` : ''}`,
  orElse: (trays: readonly string[]) => `or ${trays.join(', ')}`,
  howUnsorted: 'not sorted',
  howAside: 'set aside by you',
  trayMenu: (tray: string) => `Rename, merge or remove ${tray}`,

  // The band
  band: (parts: string[]) => parts.join(', '),
  answered: (n: number) => `${count(n)} by you`,
  sure: (n: number) => `${count(n)} sure`,
  unsureCount: (n: number) => `${count(n)} unsure`,
  unsorted: (n: number) => `${count(n)} not sorted`,
  asideCount: (n: number) => `${count(n)} set aside`,
  bandTitle: items,

  // The outlook
  outlook: 'Outlook',
  outlookNow: (expected: number, low: number, high: number) => [`about ${percent(expected)}`, ` of the rest right (${percentRange(low, high)});`] as const,
  outlookThen: (expected: number) => `ten more answers: about ${percent(expected)}`,
  outlookTitle: 'Estimated from your answers, for what you have not answered; the range holds the truth in about 95 of 100 piles. Only a spot check can show it.',
  outlookUnknown: 'How much is sorted right: too little to tell yet.',
  outlookNone: 'Everything has your answer.',

  // After the fact
  compare: 'Compare with random order',
  compareOffer: 'How many answers would it have been in random order?',
  compareTitle: 'Your answers beside random order',
  compareWorking: (done: number) => `Replaying the pile in random order: ${percent(done)}`,
  compareWorkingShort: 'Replaying',
  compareStopped: 'Stopped. Nothing was changed.',
  compareAgain: 'Work it out',
  compareSince: 'Answers were given since; work it out anew to count them.',
  compareResult: (given: number, random: number) => `You gave ${answers(given)}. In random order it would have been about ${about(random)}.`,
  compareMore: (given: number, tried: number) => `You gave ${answers(given)}. In random order it would have been more than ${count(tried)}.`,
  compareRange: (least: number | undefined, most: number | undefined, tried: number) =>
    least === undefined
      ? ''
      : most === undefined
        ? `It may have been as few as ${about(least)}, or more than ${count(tried)}.`
        : `It may have been ${about(least)} to ${about(most)}.`,
  compareNoGain: 'So the order of the questions made no difference here.',
  compareHow: [
    'A rough estimate, since nobody knows the truth of this pile: the trays as they are now stand for it, and the same sorter is given them in random order, several times anew, until it disagrees with them about as little as one that is as often right.',
    'Both lines show what share is expected to be right of what has no answer.',
  ],
  compareOwn: 'your answers',
  compareRandom: 'random order',
  compareAnswers: 'Answers',
  compareRight: 'Right, of the rest',
  compareFigures: 'The figures',
  compareTooLittle: 'There is too little to tell yet: it takes answers in two trays, and something without an answer.',

  // Top
  undo: 'Undo',
  redo: 'Redo',
  add: { photos: ['Add', ' photos'], notes: ['Add', ' notes'] },
  result: ['Take result', 'Result'],
  help: 'Help',

  // What happened
  placed: (tray: string) => `Placed in ${tray}.`,
  placedAll: (kind: Kind, n: number, tray: string) => `${items(n, kind)} placed in ${tray}.`,
  placedAside: 'Set aside.',
  placedSkip: 'Left open.',
  withdrawn: 'Answer taken back.',
  moved: (n: number) => (n === 0 ? 'No other item moved.' : n === 1 ? '1 other item moved.' : `${count(n)} other items moved.`),
  undid: (kind: string) => `Undone: ${undone[kind] ?? kind}.`,
  redid: (kind: string) => `Done again: ${undone[kind] ?? kind}.`,
  takenOut: (name: string) => `${name} is out of the pile. Undo brings it back.`,
  trayRemoved: (name: string) => `Tray ${name} removed. Undo brings it back.`,
  trayRenamed: (name: string) => `The tray is now called ${name}.`,
  trayMerged: (from: string, into: string) => `${from} is now part of ${into}.`,
  resultTaken: (file: string) => `Saved as ${file}.`,

  // Reading
  reading: (kind: Kind, done: number, total: number, seconds: number | undefined) =>
    `Reading ${kind}: ${count(done)} of ${count(total)}${seconds === undefined ? '' : `, ${timeLeft(seconds)}`}`,
  news: 'News',
  readingShort: (kind: Kind) => `Reading ${kind}`,
  fetchingShort: 'Fetching the reader for notes',
  fetching: (done: number, total: number) =>
    `Fetching the reader for notes, once: ${megabytes(done)} of ${megabytes(total)} MB. It stays on this device.`,
  stop: 'Stop',
  stopped: (done: number, total: number) => `Stopped after ${count(done)} of ${count(total)}.`,
  stopping: (kind: Kind) => `Stopping after the ${kind === 'notes' ? 'note' : 'photo'} being read …`,
  goOn: 'Read the rest',
  readAll: (kind: Kind, added: number) => (added === 0 ? `No new ${kind === 'notes' ? 'note' : 'photo'}.` : `${items(added, kind)} added.`),
  refused: (kind: Kind, n: number) =>
    kind === 'notes' ? `${notes(n)} could not be read` : n === 1 ? '1 file could not be read' : `${count(n)} files could not be read`,
  duplicates: (kind: Kind, names: { name: string; of: string }[]) => {
    const shown = names.slice(0, 3).map(({ name, of }) => (name === of ? name : `${name} (same as ${of})`));
    const rest = names.length > 3 ? ` and ${count(names.length - 3)} more` : '';
    if (kind === 'notes') {
      return `${notes(names.length)} with the text of another: one answer is for both, and all their rows are handed back: ${shown.join(', ')}${rest}.`;
    }
    return `${names.length === 1 ? '1 file was' : `${count(names.length)} files were`} in the pile already and added only once: ${shown.join(', ')}${rest}.`;
  },
  emptyFolder: (name: string) => `${name}: this folder holds no files. Choose one with photos in it.`,
  nothingDropped: 'Nothing in there can be added. Drop photos, a folder of photos, or files of notes.',
  dismiss: 'Dismiss',

  // Keeping
  notSaved: (full: boolean, message: string) =>
    full
      ? 'This device has no room left: the newest changes are not kept. Free some space and answer once more, or take the result now, before you close the tab.'
      : `The newest changes could not be kept (${message}). Take the result before you close the tab.`,
  notKept: 'This browser keeps nothing for this page (a private window?). The pile lasts until you close the tab: take the result before.',
  withoutOriginals: 'This device is nearly full: from now on only small pictures are kept, so zoom will be coarse after a reload.',
  savedAgain: 'All changes are kept again.',
  opening: 'Taking up the pile …',
  cantStart: 'The page can’t start',
  reload: 'Reload',
  tryAgain: 'Try again',
  discard: 'Forget the kept pile',

  // Tray dialog
  tray: (name: string) => `Tray “${name}”`,
  rename: 'Rename',
  name: 'Name',
  merge: 'Merge',
  mergeInto: 'Put everything into',
  remove: 'Remove this tray',
  removeHint: 'Its items go back to the sorter. You can undo it.',
  close: 'Close',

  // Start over
  startOver: 'Start over',
  startOverTitle: 'Start over?',
  startOverLoss: (kind: Kind, n: number, of: number, given: number) =>
    `This deletes ${items(n, kind)}, ${trays(of)} and ${answers(given)} from this page. It can’t be undone. The files on your disk stay as they are.`,
  startOverTeach: 'Another pile of this kind to come? What your answers taught can go with it, but only before this pile is deleted.',
  startOverDo: 'Delete the pile',
  cancel: 'Keep it',

  // Past piles
  past: 'Past piles',
  pastTitle: 'What past piles taught',
  pastWhat:
    'Piles already done can teach the sorter in which ways the things of one tray differ anyway. It then looks past these, and the next pile of the same kind needs fewer answers.',
  pastThis: 'This pile',
  startsFrom: (file: string | undefined, of: number) => `Starts from what past piles taught${file ? ` (${file})` : ''}: ${trays(of)}.`,
  startsOff: 'What past piles taught is switched off for this pile.',
  startsNow: 'This pile now starts from what past piles taught. It was sorted anew.',
  switchOff: 'Switch off',
  switchOn: 'Switch on',
  useHere: (file: string | undefined) => `Start this pile from ${file ?? 'your past piles'} too`,
  learn: 'Learn from this pile',
  learnAgain: 'Learn again',
  learnOffer: 'Another pile of this kind to come? This one can teach it.',
  canTeach: (given: number, of: number) =>
    `Your ${answers(given)} in ${trays(of)} can teach the next pile. Only what you answered counts: the sorter’s guesses would teach their mistakes as well.`,
  tooLittle: 'Too little to learn from yet: it takes answers in two trays, and two in one of them.',
  taught: (learned: number, now: number) =>
    learned === now ? `It has taught its ${answers(now)}.` : `It taught ${answers(learned)}, and has ${answers(now)} now.`,
  learningShort: 'Learning',
  learning: (done: number) => `Learning: ${percent(done)}`,
  learned: (given: number, of: number) => `Learned from ${answers(given)} in ${trays(of)}. The next pile starts from it.`,
  learningStopped: 'Stopped. Nothing was learned, and nothing was changed.',
  nextTitle: 'The next pile starts from',
  nextOf: (kind: Kind) => `The next pile of ${kind} starts from`,
  nextNothing: 'Nothing yet: no pile has taught, and no starter was opened.',
  nextStartsFrom: (kind: Kind, file: string | undefined, of: number) => `The next pile of ${kind} starts from what past piles taught${file ? ` (${file})` : ''}: ${trays(of)}.`,
  ownStarter: 'Your past piles',
  nothing: 'Nothing',
  starterFacts: (file: string | undefined, of: number, items: number, from: number, at: number) =>
    file === undefined
      ? `${trays(of)}, ${answers(items)} in ${piles(from)}; learned ${date(at)}`
      : `${trays(of)}, ${count(items)} items; opened ${date(at)}`,
  saveStarter: 'Save as a file',
  starterSaved: (file: string) => `Saved as ${file}. It tells what the past piles were like on the whole: think before you give it to others.`,
  tooFewToShare: (of: number) =>
    `This comes from ${trays(of)}, and less than 8 are not saved as a file: from so few it could tell what the trays were. It works on this device as it is; more past piles make it fit to be shared.`,
  openStarter: 'Open a starter file',
  openStarterHint: ['A file that this page or the program kenspeckle wrote.', 'You can also drop it anywhere on the page.'],
  starterTaken: (file: string, of: number) => `${file} is kept: ${trays(of)}. The next pile starts from it.`,
  starterDeleted: 'Deleted. A pile that started from it keeps its copy.',
  delete: 'Delete',
  deleteStarter: (file: string) => `Delete ${file}`,
  starterProblems: {
    'starter-unreadable': (file) => `${file} is not a starter, or it is damaged. Take it once more from where it came from.`,
    'starter-newer': (file) => `${file} was written by a newer version. Reload this page while there is a network, then open it again.`,
    'other-encoder': (file) => `${file} was learned from other material than this page reads, so it can teach nothing here.`,
  } as Record<string, (file: string) => string>,
  keptTitle: 'Kept on this device',
  kept: 'Of a past pile are kept: how the numbers that its photos or notes became differed within trays and between them, and these numbers themselves for up to 12 items a tray, without photo, text or name. Whoever has such numbers can tell much of what a photo shows or a note says. So they stay on this device, and a starter file has none of them.',
  keptNothing: 'Nothing is kept yet.',
  pastPile: (kind: Kind, at: number, of: number, given: number) => `${date(at)}: ${trays(of)}, ${answers(given)} about ${kind}`,
  forget: 'Forget',
  forgetPile: (at: number) => `Forget the pile of ${date(at)}`,
  forgetAll: 'Forget all',
  forgetSure: 'Forget for good?',
  forgot: 'Forgotten. What the other piles taught was learned anew without it.',
  forgotAll: 'All past piles and starters are forgotten.',

  // How far the sorting can be relied on
  trust: {
    title: 'How sure?',
    tabs: { sure: 'How sure', doubts: 'Doubts', check: 'Spot check' },
    line: (right: number, judged: number, low: number, high: number) =>
      `Judged by the others, ${count(right)} of ${answers(judged)} fall where you put them (${percent(low)} to ${percent(high)})`,
    lineDoubts: (n: number) => (n === 1 ? '1 doubt' : `${count(n)} doubts`),
    lineCheck: (done: number, of: number) => `Spot check: ${count(done)} of ${count(of)} looked at`,
    open: 'How sure?',
    reckoning: 'Being reckoned …',
    tooFew: 'It takes answers in two trays before anything can be said.',
    range: (low: number, high: number) => `${percent(low)} to ${percent(high)}`,
    asTable: 'As a table',
    take: (name: string) => `Take ${name} in hand`,
    now: 'now',

    overall: 'How well your answers sort each other',
    overallHow:
      'Each answer is judged by the others, as if you had not given it. The line across a bar shows what so few can promise: in 95 of 100 piles the truth is within it. What was asked about is harder than most, so the rest is usually sorted better.',
    notYet: (n: number) => `Nothing can be known yet from ${answers(n)}: it takes two in one tray.`,
    shareWords: (right: number, judged: number, low: number, high: number) =>
      `${count(right)} of ${answers(judged)} would have gone where you put them; from so few, anything from ${percent(low)} to ${percent(high)} is possible.`,
    shareShort: (right: number, judged: number, low: number, high: number) =>
      `${count(right)} of ${count(judged)}: ${percent(low)} to ${percent(high)}`,
    byTray: 'The same by tray',
    tray: 'Tray',
    share: 'Answers that the others put there too',
    single: 'one answer: can’t be known yet',
    notJudged: 'not judged',

    confused: 'What gets confused',
    nothingConfused: 'Nothing so far: the others put every answer where you did.',
    takenFor: (n: number, tray: string, other: string) => `${count(n)} of ${tray} taken for ${other}`,
    looksLike: (tray: string) => `${tray}:`,

    ahead: 'What more answers would bring',
    target: 'Sorted right, as much as',
    projection: ({ target, low, likely, high }: { target: number; low: number; likely: number | null; high: number | null }, left: number) => {
      const goal = percent(target);
      const beyond = likely !== null && likely > left ? ` The pile has only ${count(left)} more.` : '';
      if (likely === 0 && high === 0) return `${goal} is reached, even if everything is on the slow side.`;
      if (likely === 0 && high !== null) return `${goal} is probably reached; to be safe, up to ${count(high)} more answers.`;
      if (likely === 0) return `${goal} is probably reached; how many more answers make it safe can’t be told yet.`;
      if (likely === null) return `At least ${count(low)} more answers to reach ${goal}; how many can’t be told from these.`;
      return `About ${count(likely)} more answers to reach ${goal}: at least ${count(low)}, ${high === null ? 'how many at most can’t be told yet' : `at most ${count(high)}`}.${beyond}`;
    },
    moreAnswers: 'more answers',
    likely: 'likely',
    possible: 'possible',
    aheadHow: 'The line is the likeliest way on, the band what is possible, the dashed line what you want to reach. Judged by your answers alone, and a guess: look again when you get there.',
    noCurve: 'Can’t be told yet: it takes three answers in one tray.',

    calibration: 'Do the percentages keep their word?',
    calibrationError: (error: number) => `They are off by ${percent(error)} on average.`,
    calibrationHow: 'A dot on the dashed line: of what is called 80% sure, 80% was right. Below it the sorter was too sure of itself, above it too modest. Lines show how little so few answers can tell.',
    said: 'sorter said',
    came: 'was right',
    answersColumn: 'answers',
    scores: (brier: number, logLoss: number) => `Brier score ${brier.toFixed(3)} (0 to 2), log loss ${logLoss.toFixed(3)}; the less the better.`,

    terms: 'How careful it should be',
    confidence: 'Confidence of plausible trays',
    confidenceHint: (share: number) => `The right tray is among the plausible ones for about ${percent(share)} of the items, as far as they are like your answers.`,
    asideShare: 'How many known items may be set aside',
    asideHint: 'What is unlike anything shown goes to no tray. The more of what does belong somewhere may be lost with it, the more strangers are found.',
    onlySure: 'Sort only what has exactly one plausible tray; set the rest aside',
    termsSet: 'The pile was sorted anew.',

    doubtsHow: 'Answers that something else speaks against, the gravest first. Look at each: you may well be right.',
    noDoubts: 'No doubts: nothing speaks against any of your answers.',
    noDoubtsHint: 'Only trays with two answers or more can raise any.',
    doubtOf: (name: string, tray: string, rather: string) => `${name}: ${tray}, or rather ${rather}?`,
    why: {
      contradicted: (rather: string) => `The other answers speak for ${rather}.`,
      duplicate: (rather: string) => `All but the same lies in ${rather}.`,
      changed: (rather: string) => `You put it in ${rather} before.`,
    } as Record<string, (rather: string) => string>,
    youSaid: (tray: string) => `You said ${tray}`,
    othersSay: (tray: string) => `Rather ${tray}`,
    twinIn: (tray: string) => `This one is in ${tray}`,
    keep: (tray: string) => `Leave in ${tray}`,
    move: (tray: string) => `Move to ${tray}`,
    kept: (tray: string) => `Stays in ${tray}, and is not doubted again.`,
    changed: (tray: string) => `Moved to ${tray}.`,

    planning: 'Look at a random sample, and sign for the rest',
    planningHow: 'All else here is judged by your own answers. A spot check needs no such faith: it draws items at random from what the sorter sorted, you say of each whether it is right, and it tells what that promises about all of them.',
    tolerance: 'May be wrong in the end, at most',
    checkConfidence: 'How sure you want to be of that',
    allowed: 'Wrong ones allowed among those looked at',
    none: 'none',
    byTrayCheck: 'From each tray its share, tray by tray (a few more to look at)',
    size: (of: number) => `to look at, of ${count(of)} that the sorter sorted.`,
    start: (n: number) => `Start: look at ${count(n)}`,
    nothingToCheck: 'The sorter has sorted nothing yet, so there is nothing to check.',
    underWay: 'A spot check is under way',
    lookedAt: 'looked at',
    lookedAtOf: (done: number, of: number) => `${count(done)} of ${count(of)} looked at`,
    goOn: 'Go on',
    toTheEnd: 'To the end',
    giveUp: 'Give it up',
    giveUpHint: 'It stays as it is until you go on, also after a reload. Given up, it makes no statement; what you looked at stays answered.',
    pause: 'Pause',
    isIt: (tray: string) => `${tray}: is that right?`,
    right: 'Right',
    elsewhere: 'Wrong? It belongs in',
    allLookedAt: 'All looked at',
    tally: (right: number, wrong: number, untold: number) =>
      `${count(right)} right, ${count(wrong)} wrong${untold > 0 ? `, ${count(untold)} can’t be told (they count as wrong)` : ''}.`,
    allLookedAtHint: 'With the statement they all become answers, the wrong ones corrected. Undo leads back to the last one.',
    state: 'Make the statement',
    stated: 'Stated. What you looked at counts as answered.',
    dropped: 'The spot check is given up. What you looked at stays answered.',
    statementTitle: 'What it shows',
    bound: (tolerance: number) => `The bar: what may be wrong at most. The dashed line: the ${percent(tolerance)} you tolerate.`,
    statementHow: 'True with the stated confidence, whatever the pile is, provided that you looked at every one and that the sort is used as it was drawn from. Items that you answered or that are set aside are no part of it.',
    statementTrays: 'Tray by tray',
    sortedColumn: 'sorted',
    wrongColumn: 'wrong',
    untoldColumn: 'can’t tell',
    aboutNow: 'This is about the pile as it is sorted now.',
    aboutEarlier: 'This is about the sort as it was: answers have come in since, and items may lie elsewhere now. For a statement about the pile as it is, check again.',
    holds: (tolerance: number) => `That is within the ${percent(tolerance)} you tolerate.`,
    holdsNot: (tolerance: number) =>
      `That is more than the ${percent(tolerance)} you tolerate. Those found wrong are corrected; give some more answers, then check again.`,
    copy: 'Copy the sentence',
    copied: 'Copied.',
    cantCopy: 'The browser does not let the page copy. Select the sentence and copy it.',
    saveNote: 'Save a note to hand over',
    noteTitle: 'Spot check',
    noteRest: (given: number, aside: number) => `No part of it: ${answers(given)} by a person, and ${count(aside)} items set aside.`,
    noteTray: (tray: string, sorted: string, looked: string, wrong: string, untold: string) =>
      `${tray}: ${sorted} sorted, ${looked} looked at, ${wrong} wrong, ${untold} can't be told`,
    again: 'Check again',
    columns: { plausible: 'plausible', aside: 'set aside', checked: 'spot check' },
    byYou: 'none of these',
    judged: { right: 'right', wrong: 'taken out', untold: 'can’t tell', belongs: 'corrected' },
  },

  // Notes
  noteAt: (file: string, line: number) => `${file}, line ${count(line)}`,
  noteInHand: (name: string) => `Note: ${name}`,
  inParts: (parts: number) => `Long: read in ${count(parts)} parts and averaged.`,
  longNotes: (n: number) =>
    `${n === 1 ? '1 note is' : `${count(n)} notes are`} longer than about 180 words: read in parts and averaged, so what spans two parts is not seen as a whole.`,
  timesOver: (n: number) => `This text stands in ${rows(n)}.`,
  rowOpening: 'Opening the file …',
  addNotesTitle: 'Which notes?',
  writeTitle: 'Paste or write notes',
  writeLabel: 'Notes, one a line',
  writeFound: (n: number) => (n === 0 ? 'Every line becomes a note.' : `${notes(n)}: every line becomes one.`),
  pasted: (n: number) => `pasted-${n}.txt`,
  addThem: (n: number) => (n === 0 ? 'Add notes' : `Add ${notes(n)}`),
  leaveOut: 'Leave out',
  columnQuestion: 'Which column holds the notes?',
  columnHint: 'All other columns are kept and come back with the result.',
  columnFacts: (n: number, of: number) => (n === of ? rows(of) : `${rows(of)}, ${count(of - n)} of them without a note: these come back as they are.`),
  preview: 'The first notes',
  linesQuestion: 'What is one note?',
  everyLine: (n: number) => `Every line: ${notes(n)}`,
  everyFile: (n: number) => (n === 1 ? 'The whole file: 1 note' : `Every file: ${notes(n)}`),
  someFiles: (n: number) => `${count(n)} files of text`,
  manyFiles: (n: number) => `${count(n)} files.jsonl`,
  guessed: 'Read as Windows-1252, since it is not UTF-8. If letters look wrong below, save the file as UTF-8 and choose it again.',
  namelessColumn: (at: number) => `Column ${count(at)}`,
  troubles: (n: number) => `${rows(n)} can’t be read and will be left out`,
  emptyColumn: 'There is nothing in this column.',
  leftOut: (file: string, troubles: readonly string[]) => {
    const rest = troubles.length > 3 ? ` And ${count(troubles.length - 3)} more.` : '';
    return `${file}: ${rows(troubles.length)} left out. ${troubles.slice(0, 3).map((trouble) => `L${trouble.slice(1)}.`).join(' ')}${rest}`;
  },
  notesAgain: (file: string) => `${file}: all of its notes are in the pile already.`,
  fileProblem: (file: string, problem: string) => `${file}: ${problem}`,

  // Kits
  kits: 'Kits',
  kitsTitle: 'Your kits',
  kitsWhat: 'A kit is a pile with its trays and answers. It holds either photos or notes, since the two can’t be compared. All kits stay on this device.',
  kitFacts: (kind: Kind, n: number, of: number, given: number) => `${items(n, kind)}, ${trays(of)}, ${answers(given)}`,
  kitNow: 'open now',
  openKit: 'Open',
  openKitLong: (name: string) => `Open ${name}`,
  renameKit: (name: string) => `Rename ${name}`,
  kitName: 'Name of the kit',
  saveName: 'Save name',
  nameTaken: (name: string) => `Another kit is called ${name}. Choose another name.`,
  nameEmpty: 'A kit needs a name.',
  deleteKit: (name: string) => `Delete ${name}`,
  deleteKitSure: 'Delete for good?',
  kitDeleted: (name: string) => `${name} is deleted.`,
  newKit: 'Start another kit',
  newKitHint: 'This one stays as it is.',
  noKits: 'No kit yet: add photos or notes.',
  kitBusy: 'Something is being read. Wait for it, or stop it: then other kits can be opened.',
  kitRest: 'Reading was stopped. What was not read yet stays out when you open another kit.',
  kitsNotKept: 'This browser keeps nothing for this page, so there is only the kit on the bench.',
  newKitName: { photos: 'Photos', notes: 'Notes' },
  demoKitName: { photos: 'Demo photos', notes: 'Demo notes' },
  otherTitle: (kind: Kind) => (kind === 'notes' ? 'Notes into a kit of photos?' : 'Photos into a kit of notes?'),
  otherWhat: (kind: Kind, files: number, kit: string) =>
    `“${kit}” holds ${kind === 'notes' ? 'photos' : 'notes'}, and the two can’t be compared. Where should the ${files === 1 ? '1 file' : `${count(files)} files`} go?`,
  otherNew: 'Into another kit',
  otherInto: (name: string) => `Into “${name}”`,
  otherLeave: 'Nowhere: leave out',

  // Camera
  cameraTitle: 'Take pictures into the pile',
  shoot: 'Take picture',
  shot: (n: number) => (n === 0 ? 'Each picture goes straight into the pile.' : `${photos(n)} taken.`),
  done: 'Done',
  cameraStarting: 'Starting the camera …',
  cameraRefused: 'The browser was not allowed to use the camera. Allow it in the settings for this page (beside the address), then try again.',
  cameraNone: 'No camera found. Connect one, or choose photos instead.',
  cameraBusy: 'The camera is in use by another program. Close that program, then try again.',
  cameraFailed: (message: string) => `The camera can’t be used: ${message}`,

  // Help
  helpTitle: 'How it works',
  helpSteps: [
    'Add photos or notes. They are read on this device.',
    'Say for the item in hand which tray it belongs in: press its number, or name a new tray.',
    'The pile sorts itself after every answer. Sure ones stand at the back of a shelf, unsure ones come forward to the edge.',
    'Sometimes a strip of look-alikes comes instead: take out what does not belong (arrows and Space, or a tap), then Enter for the rest.',
    'See one in the wrong place? Click it and answer, or drag it onto the right shelf.',
    'How sure is it? See what gets confused, settle doubts, and look at a random sample to sign for the rest.',
    'Good enough? Take the result: a table with one line an item.',
    'Another pile of this kind to come? Let this one teach it: then it needs fewer answers.',
  ],
  keysTitle: 'Keys',
  keys: [
    ['1 … 9, 0', 'it belongs in that tray'],
    ['Enter', 'the guess is right'],
    ['T or /', 'find a tray, or name a new one'],
    ['N', 'none of these: set aside'],
    ['C', 'can’t tell: ask me another'],
    ['U', 'undo (also Ctrl Z or ⌘ Z)'],
    ['Shift U', 'redo (also Ctrl Y or Shift ⌘ Z)'],
    ['S', 'look-alikes at once, or one at a time'],
    ['Space', 'in a strip: take it out, or back in'],
    ['Z', 'zoom'],
    ['Arrows', 'between items on the shelves; a tray’s number answers the item, Enter takes it in hand'],
    ['Delete', 'take the item out of the pile'],
    ['Q', 'back to the question'],
    ['P', 'what past piles taught'],
    ['H', 'how sure: doubts, spot check'],
    ['K', 'your kits'],
    ['?', 'this panel'],
  ] as const,
  singleKeys: 'Single keys act (switch off if you use speech input)',
  privacyTitle: 'Privacy',
  privacy:
    'Photos, notes, trays and answers stay in this browser’s storage on this device until you start over, delete the kit or clear the data of this site. What past piles taught stays until you forget it. The page sends nothing: its own rules forbid it to talk to any other server.',
  limitsTitle: 'Limits',
  limits: 'The figures say how sure the sorter is from the few examples it has seen. They are not a promise; the sentence of a spot check is one. Look along the edges before you rely on a shelf.',
  caution:
    'A sort is a guess from a few examples. Where a wrong one could hurt someone (what is eaten, medicine, safety, decisions about people) do not rely on it: leave each item to someone licensed to judge it, and to your local rules.',
};
