/**
 * Three-valued truth (Kleene's strong logic): a condition that turns on something unknown is not
 * true, and neither is its `not`. Ordered so that `and` is the least and `or` the greatest.
 */
export const FALSE = 0;
export const UNKNOWN = 1;
export const TRUE = 2;
export type Truth = 0 | 1 | 2;

export function truth(holds: boolean): Truth {
  return holds ? TRUE : FALSE;
}

export function not(value: Truth): Truth {
  return (2 - value) as Truth;
}
