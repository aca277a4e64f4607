import type { DrawSpec } from './program.js';

/** Whole shuffles are tried this often before the block is built value by value. */
const SHUFFLES = 64;

/**
 * A block in which each option comes as often as its weight says, shuffled (Fisher and Yates), with
 * no run longer than the draw allows, the run before the block counted in.
 * @param random a number in [0, 1) for an index and an attempt
 */
export function shuffledBlock(
  spec: DrawSpec,
  random: (index: number, attempt: number) => number,
  runOption: number,
  runLength: number,
): number[] {
  let weightSum = 0;
  for (const weight of spec.weights) weightSum += weight;
  const copies = spec.weights.map((w) => Math.floor((w * spec.blockSize) / weightSum + 0.5));
  const block = copies.flatMap((count, option) => new Array<number>(count).fill(option));
  for (let attempt = 0; attempt < SHUFFLES; attempt++) {
    for (let n = block.length - 1; n > 0; n--) {
      const other = Math.floor(random(n, attempt) * (n + 1));
      [block[n], block[other]] = [block[other]!, block[n]!];
    }
    if (spec.mostInARow === 0 || runsAllowed(block, spec.mostInARow, runOption, runLength)) {
      return block;
    }
  }
  return built(copies, spec.mostInARow, random, runOption, runLength) ?? block;
}

function runsAllowed(block: number[], most: number, runOption: number, runLength: number): boolean {
  let option = runOption;
  let length = runLength;
  for (const next of block) {
    length = next === option ? length + 1 : 1;
    option = next;
    if (length > most) return false;
  }
  return true;
}

/** Value by value, by what is left of each, never into a corner. */
function built(
  copies: readonly number[],
  most: number,
  random: (index: number, attempt: number) => number,
  runOption: number,
  runLength: number,
): number[] | undefined {
  const left = [...copies];
  const block: number[] = [];
  let option = runOption;
  let length = runLength;
  let total = left.reduce((sum, count) => sum + count, 0);
  while (total > 0) {
    const open = left.map((count, n) => {
      if (count === 0 || (n === option && length >= most)) return 0;
      left[n]!--;
      const fits = canFinish(left, most, n, n === option ? length + 1 : 1);
      left[n]!++;
      return fits ? count : 0;
    });
    let share = random(block.length, SHUFFLES) * open.reduce((sum, count) => sum + count, 0);
    let chosen = -1;
    for (let n = 0; n < open.length; n++) {
      if (open[n]! === 0) continue;
      chosen = n;
      share -= open[n]!;
      if (share < 0) break;
    }
    if (chosen < 0) return undefined;
    length = chosen === option ? length + 1 : 1;
    option = chosen;
    left[chosen]!--;
    total--;
    block.push(chosen);
  }
  return block;
}

/** What is left can be laid out: no option needs more gaps than the others leave. */
function canFinish(left: readonly number[], most: number, option: number, length: number): boolean {
  const total = left.reduce((sum, count) => sum + count, 0);
  return left.every((count, n) => {
    const others = total - count;
    return count <= others * most + (n === option ? most - length : most);
  });
}
