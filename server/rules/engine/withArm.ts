import type { Program } from './program.js';

/**
 * The program whose sealed draw can only come out as `arm`, which is one of its words; undefined
 * leaves it to chance.
 */
export function withArm(program: Program, arm: string | undefined): Program {
  const { sealed, draws } = program;
  if (sealed === undefined || arm === undefined) return program;
  const one = draws.map((draw) =>
    draw.name === sealed.draw
      ? { ...draw, weights: draw.options.map(({ word }) => (word === arm ? 1 : 0)) }
      : draw,
  );
  return { ...program, draws: one };
}
