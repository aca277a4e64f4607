/**
 * Every problem that a rules file can have, once. Codes are stable: tools may match on them.
 * `RULES.md` lists them all (a test holds the two together).
 */
export interface ProblemEntry {
  readonly severity: 'error' | 'warning';
  /** What it means, as on the page. */
  readonly meaning: string;
}

const error = (meaning: string): ProblemEntry => ({ severity: 'error', meaning });
const warning = (meaning: string): ProblemEntry => ({ severity: 'warning', meaning });

export const PROBLEMS = {
  // Outline.
  encoding: error('The file is not plain UTF-8 text.'),
  tooLarge: error('The file, a line, a phrase or a number is larger than any session needs.'),
  tooDeep: error('Lines or parentheses are nested too deep.'),
  tooMany: error('There are more names, actions or problems than are read at once.'),
  yamlSyntax: error('The outline cannot be read: an indent, a colon or a quote is out of place.'),
  yamlNotAllowed: error('A part of YAML that a rules file has no use for.'),
  unknownKey: error('A key that is not known here.'),
  missingKey: error('A key that must be there is not.'),
  doubledKey: error('A key is written twice.'),
  linesExpected: error('A phrase stands where indented lines belong.'),
  phraseExpected: error('Lines, a list or nothing stand where a phrase belongs.'),
  badName: error('A name is not letters, digits and `_`, beginning with a letter.'),
  reservedName: error('A name is a word of the language.'),
  nameTwice: error('Two things have the same name.'),
  badPath: error('A file name leads out of the folder of the rules file.'),
  unreadableFile: error('An included file or a table cannot be read.'),
  badTable: error('A table is not one of the two forms.'),
  tableOrder: error('A row of a table is out of order.'),
  // Phrase.
  unexpectedWord: error('A word out of place.'),
  unitMissing: error('A number without a unit.'),
  unknownUnit: error('A unit that is not known.'),
  scopeMissing: error('A count without its scope.'),
  andOrMixed: error('`and` mixed with `or` without parentheses.'),
  isNotOr: error('`is not` with more than one choice.'),
  wrongForm: error('A form from elsewhere; the right form is shown.'),
  // Meaning.
  unknownName: error('A name that nothing has.'),
  wrongKind: error('A name of the wrong kind.'),
  unitsDiffer: error('Units that do not agree.'),
  unknownWord: error('A word that the draw, choice or input never takes.'),
  measureInConstant: error('A measure where only constants may stand.'),
  visitWithoutPlace: error('`this visit` without a place.'),
  outOfRange: error('A number that makes no sense there.'),
  circle: error('Names that need each other.'),
  firingCircle: error('Rules that fire each other with no time between.'),
  // Rig.
  beltDiffers: error('The belt lengths of the rules file and the rig differ.'),
  rigLacks: error('An output, input or valve that the rig lacks.'),
  actionTooLong: error("One action is longer than its output's longest on-time."),
  pulseFillsPeriod: error('A pulse as long as its period, or longer.'),
  volumeOutOfRange: error("A volume outside the valve's calibration."),
  // Draws.
  weightsMismatch: error('Weights that do not match the choices.'),
  blockMismatch: error('A block that the choices or weights do not divide.'),
  drawImpossible: error('A least distance, run or step that cannot be kept.'),
  sealedForm: error('A sealed draw that is not one plain choice of words for the whole session.'),
  sealedSeen: error('A sealed draw where it could be seen, or drunk.'),
  offBelt: error('A place off the belt.'),
  mixedChoices: error('Choices of different kinds.'),
  // Warnings: it can never happen.
  neverTrue: warning('A condition that can never be true.'),
  phaseUnreached: warning('A phase that is never reached.'),
  windowTooLong: warning('A window longer than its phase.'),
  limitIdle: warning('A limit that can never matter.'),
  unusedName: warning('A name or draw that is never used.'),
  // It may surprise.
  noLimit: warning('A rule with no limit on a moment that can come any number of times.'),
  sameOutput: warning('Two rules on one output at one moment.'),
  endsMidLap: warning("A phase that can end in mid-lap before other rules' places."),
  endsEarly: warning('`lap >=` where something ends: it ends as that lap begins.'),
  trueAtStart: warning('A phase or session that ends as it starts.'),
  staleDraw: warning('A draw read some time after the firing that renews it.'),
  blockUnfinished: warning('A block not finished when its phase ends.'),
  oneChoice: warning('A draw or choice with one choice.'),
  isOnMeasured: warning('`is` on a measured amount.'),
  // It will fall short.
  limitBeyondRig: warning("A limit beyond the rig's."),
  dutyBeyondRig: warning('A duty that the guard will withhold.'),
  outlastsStay: warning('A pulse longer than the animal is likely to stay.'),
  withinTooTight: warning('A `within` tighter than one count or one frame.'),
  nearSeam: warning('A place nearer the seam than the slip allowed.'),
  fewChoices: warning('A least distance that leaves few choices.'),
  // It may never stop.
  noEnd: warning('A session that nothing ends.'),
  noWayOut: warning('A phase with no way out.'),
  // Text lost.
  textLost: warning('A comment straight after the title.'),
} as const satisfies Record<string, ProblemEntry>;

export type ProblemCode = keyof typeof PROBLEMS;
