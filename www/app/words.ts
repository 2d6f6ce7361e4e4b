/** All that the page says, in one place. */

const whole = new Intl.NumberFormat('en');
const share = new Intl.NumberFormat('en', { style: 'percent', maximumFractionDigits: 0 });

export const count = (n: number): string => whole.format(n);
export const percent = (fraction: number): string => share.format(fraction);

function photos(n: number): string {
  return n === 1 ? '1 photo' : `${count(n)} photos`;
}

function answers(n: number): string {
  return n === 1 ? '1 answer' : `${count(n)} answers`;
}

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
};

export const words = {
  brand: 'Kenspeckle',

  // The empty page
  promise: ['Show a few.', 'The rest sorts itself.'],
  job: 'For a pile of photos and categories that exist only in your head. Say for a handful where they belong. After every answer the whole pile sorts itself anew, and shows you where it is unsure.',
  demo: 'Try the demo pile',
  demoLoading: 'Fetching the demo pile …',
  demoMissing: 'The demo pile can’t be loaded. It needs the network once; then it works without.',
  chooseFiles: 'Choose photos',
  chooseFolder: 'Choose a folder',
  camera: 'Take pictures',
  dropHint: 'Or drop photos or a folder anywhere on this page, or paste.',
  private: 'Nothing leaves this device.',
  privateLong: 'Reading, sorting and keeping all happen in this browser. Once loaded, the page works without a network.',
  dropNow: 'Let go to add to the pile',

  // In hand
  question: 'Which tray?',
  yourAnswer: (tray: string) => `You put it in ${tray}`,
  yourNone: 'You set it aside',
  askedEarlier: 'You couldn’t tell',
  guess: 'sorter’s guess',
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

  // Shelves
  shelves: 'Shelves',
  pile: 'The pile',
  pileHint: 'not sorted yet',
  aside: 'Set aside',
  asideHint: 'none of the trays',
  sureOf: (tray: string) => `${tray}: sure`,
  unsureOf: (tray: string) => `${tray}: unsure, least sure first`,
  unsure: 'unsure',
  emptyTray: 'Nothing here yet',
  more: [(n: number) => `+${count(n)}`, ' more'] as const,
  moreLong: (n: number, tray: string) => `Show ${count(n)} more in ${tray}`,
  fewer: 'Show fewer',
  tile: (name: string, tray: string, how: string) => `${name}, ${tray}, ${how}`,
  howAnswered: 'your answer',
  howSure: (probability: number) => `${percent(probability)} sure`,
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
  bandTitle: (items: number) => photos(items),

  // Top
  undo: 'Undo',
  redo: 'Redo',
  add: ['Add', ' photos'],
  result: ['Take result', 'Result'],
  help: 'Help',

  // What happened
  placed: (tray: string) => `Placed in ${tray}.`,
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
  reading: (done: number, total: number, seconds: number | undefined) =>
    `Reading photos: ${count(done)} of ${count(total)}${seconds === undefined ? '' : `, ${timeLeft(seconds)}`}`,
  news: 'News',
  readingShort: 'Reading photos',
  stop: 'Stop',
  stopped: (done: number, total: number) => `Stopped after ${count(done)} of ${count(total)}.`,
  stopping: 'Stopping after the photo being read …',
  goOn: 'Read the rest',
  readAll: (added: number) => (added === 0 ? 'No new photo.' : `${photos(added)} added.`),
  refused: (n: number) => (n === 1 ? '1 file could not be read' : `${count(n)} files could not be read`),
  duplicates: (names: { name: string; of: string }[]) => {
    const shown = names.slice(0, 3).map(({ name, of }) => (name === of ? name : `${name} (same as ${of})`));
    const rest = names.length > 3 ? ` and ${count(names.length - 3)} more` : '';
    return `${names.length === 1 ? '1 file was' : `${count(names.length)} files were`} in the pile already and added only once: ${shown.join(', ')}${rest}.`;
  },
  emptyFolder: (name: string) => `${name}: this folder holds no files. Choose one with photos in it.`,
  nothingDropped: 'Nothing in there can be added. Drop photos or a folder of photos.',
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
  startOverLoss: (items: number, trays: number, given: number) =>
    `This deletes ${photos(items)}, ${trays === 1 ? '1 tray' : `${count(trays)} trays`} and ${answers(given)} from this page. It can’t be undone. The files on your disk stay as they are.`,
  startOverDo: 'Delete the pile',
  cancel: 'Keep it',

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
    'Add photos. They are read on this device.',
    'Say for the item in hand which tray it belongs in: press its number, or name a new tray.',
    'The pile sorts itself after every answer. Sure ones stand at the back of a shelf, unsure ones come forward to the edge.',
    'See one in the wrong place? Click it and answer, or drag it onto the right shelf.',
    'Good enough? Take the result: a table with one line an item.',
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
    ['Z', 'zoom'],
    ['Arrows', 'between items on the shelves; a tray’s number answers the item, Enter takes it in hand'],
    ['Delete', 'take the item out of the pile'],
    ['Q', 'back to the question'],
    ['?', 'this panel'],
  ] as const,
  singleKeys: 'Single keys act (switch off if you use speech input)',
  privacyTitle: 'Privacy',
  privacy:
    'Photos, trays and answers stay in this browser’s storage on this device until you start over or clear the data of this site. The page sends nothing: its own rules forbid it to talk to any other server.',
  limitsTitle: 'Limits',
  limits: 'The figures say how sure the sorter is from the few examples it has seen. They are not a promise: look along the edges before you rely on a shelf.',
  caution:
    'A sort is a guess from a few examples. Where a wrong one could hurt someone (what is eaten, medicine, safety, decisions about people) do not rely on it: leave each item to someone licensed to judge it, and to your local rules.',
};
