/** Bounds on what is read, so that no file, however hostile, costs more than a known work. */

/** Characters in a rules file or an included one. */
export const LONGEST_FILE = 256 * 1024;
/** Characters in a table's file. */
export const LONGEST_TABLE = 1024 * 1024;
/** Rows of a table. */
export const MOST_ROWS = 50_000;
export const LONGEST_LINE = 2_000;
/** Characters in one phrase, which may go on over lines. */
export const LONGEST_PHRASE = 2_000;
/** Words, numbers and signs in one phrase. */
export const MOST_TOKENS = 400;
/** Parentheses within parentheses, and outline within outline. */
export const DEEPEST_NESTING = 32;
/** Spaces before a line; deeper is read as nesting too deep. */
export const WIDEST_INDENT = 200;
export const LONGEST_NAME = 64;
/** Declarations in all sections together. */
export const MOST_NAMES = 1_000;
/** Rules in one file: some checks look at every pair. */
export const MOST_RULES = 256;
/** Actions under one `do`. */
export const MOST_ACTIONS = 16;
/** Problems reported at once. */
export const MOST_PROBLEMS = 100;
/** Letters in one number. */
export const LONGEST_NUMBER = 15;
