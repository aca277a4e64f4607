/** Which key does what: by where the key lies, so that number pads, pedals and other layouts work. */

export interface KeyedAct {
  readonly act: string;
  readonly title: string;
  /** `KeyboardEvent.code`s; the second is for a number pad. */
  readonly codes: readonly string[];
}

/** How many of the rules file's own buttons and wishes have keys. */
const SLOTS = 9;

const FIXED = [
  { act: 'hold stimulus', title: 'Hold or release the stimulus', codes: ['KeyS', 'Numpad0'] },
  { act: 'hold water', title: 'Hold or release the water', codes: ['KeyW', 'NumpadDecimal'] },
  { act: 'mark', title: 'Mark now, and note it', codes: ['KeyN', 'NumpadAdd'] },
  { act: 'exclude this', title: 'Exclude this lap', codes: ['KeyX'] },
  { act: 'exclude last', title: 'Exclude the last lap', codes: ['KeyZ'] },
  { act: 'next phase', title: 'Next phase', codes: ['KeyP'] },
  { act: 'previous phase', title: 'Phase before', codes: ['BracketLeft'] },
  { act: 'repeat phase', title: 'This phase again', codes: ['KeyR'] },
  { act: 'next cell', title: 'Next cell', codes: ['KeyC'] },
  { act: 'put off', title: 'Put off the end', codes: ['KeyE', 'NumpadMultiply'] },
  { act: 'acknowledge', title: 'Alarms are seen', codes: ['KeyA', 'NumpadDivide'] },
  { act: 'hand on belt', title: 'Hand on or off the belt', codes: ['KeyH'] },
  { act: 'stop', title: 'Stop everything, beside Esc', codes: [] },
] as const satisfies readonly KeyedAct[];

export type SlotAct = `slot ${number}`;
export type KeyAct = (typeof FIXED)[number]['act'] | SlotAct;

/** Every act that has a key, in the order of the panel. */
export const KEYED: readonly (KeyedAct & { readonly act: KeyAct })[] = [
  ...FIXED,
  ...Array.from({ length: SLOTS }, (_, n) => ({
    act: slotAct(n)!,
    title: `Button or wish ${n + 1} of the rules file`,
    codes: [`Digit${n + 1}`, `Numpad${n + 1}`],
  })),
];

/** The act of the nth button or wish of a session, from 0; undefined beyond those with keys. */
export function slotAct(n: number): SlotAct | undefined {
  return n < SLOTS ? `slot ${n + 1}` : undefined;
}

export type Keymap = Readonly<Record<string, readonly string[]>>;
export const KEYS_AN_ACT = 2;

export const DEFAULT_KEYMAP: Keymap = Object.fromEntries(
  KEYED.map(({ act, codes }) => [act, codes]),
);

/** Keys that the page or the browser needs for itself. */
const TAKEN: Readonly<Record<string, string>> = {
  Escape: 'Esc stops everything',
  Tab: 'Tab moves from control to control',
  Enter: 'Enter presses what has the focus',
  NumpadEnter: 'Enter presses what has the focus',
  Space: 'Space presses what has the focus',
  ArrowUp: 'arrows move within controls',
  ArrowDown: 'arrows move within controls',
  ArrowLeft: 'arrows move within controls',
  ArrowRight: 'arrows move within controls',
  F5: 'the browser loads the page anew with it',
  F11: 'the browser fills the screen with it',
  F12: 'the browser opens its tools with it',
};
const MODIFIER = /^(Shift|Control|Alt|Meta|OS)(Left|Right)$|^(CapsLock|NumLock|ContextMenu)$/;

/** Why a key cannot be given to an act; empty when it can. */
export function keyProblem(map: Keymap, act: string, code: string): string {
  if (code === '') return 'This key says nothing of where it lies; another is needed.';
  const taken = TAKEN[code];
  if (taken !== undefined) return `${keyLabel(code)} is not free: ${taken}.`;
  if (MODIFIER.test(code)) return `${keyLabel(code)} works only together with another key.`;
  const other = KEYED.find((one) => one.act !== act && map[one.act]?.includes(code));
  return other ? `${keyLabel(code)} is taken: ${other.title}. Change that first.` : '';
}

/** With the nth key of an act changed, or taken away (undefined). */
export function withKey(map: Keymap, act: string, n: number, code: string | undefined): Keymap {
  const codes = [...(map[act] ?? [])];
  if (code === undefined) codes.splice(n, 1);
  else codes[n] = code;
  return { ...map, [act]: [...new Set(codes.filter(Boolean))].slice(0, KEYS_AN_ACT) };
}

/** The act of a key; undefined for a key of no act. */
export function actOf(map: Keymap, code: string): KeyAct | undefined {
  return KEYED.find(({ act }) => map[act]?.includes(code))?.act;
}

/** What the browser kept, as far as it makes sense; the rest is as at first. */
export function readKeymap(text: string | null): Keymap {
  let kept: unknown;
  try {
    kept = JSON.parse(text ?? '{}');
  } catch {
    kept = {};
  }
  let map: Keymap = Object.fromEntries(KEYED.map(({ act }) => [act, []]));
  const put = (act: string, codes: unknown) => {
    for (const code of Array.isArray(codes) ? codes : []) {
      const fits = typeof code === 'string' && keyProblem(map, act, code) === '';
      if (fits) map = withKey(map, act, map[act]!.length, code as string);
    }
  };
  const said = (typeof kept === 'object' && kept !== null ? kept : {}) as Record<string, unknown>;
  for (const { act } of KEYED) if (act in said) put(act, said[act]);
  for (const { act, codes } of KEYED) if (!(act in said)) put(act, codes);
  return map;
}

const NAMES: Readonly<Record<string, string>> = {
  BracketLeft: '[',
  BracketRight: ']',
  Semicolon: ';',
  Quote: "'",
  Comma: ',',
  Period: '.',
  Slash: '/',
  Backslash: '\\',
  Minus: '-',
  Equal: '=',
  Backquote: '`',
  NumpadDecimal: 'Pad .',
  NumpadAdd: 'Pad +',
  NumpadSubtract: 'Pad −',
  NumpadMultiply: 'Pad ×',
  NumpadDivide: 'Pad ÷',
};

/** What stands on a key, as on most keyboards. */
export function keyLabel(code: string): string {
  const [, kind, rest] = /^(Key|Digit|Numpad)(\w)$/.exec(code) ?? [];
  if (kind !== undefined) return kind === 'Numpad' ? `Pad ${rest}` : rest!;
  return NAMES[code] ?? code.replace(/([a-z])([A-Z])/g, '$1 $2');
}
