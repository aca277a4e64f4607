import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { ILLEGAL, QuadratureDecoder } from '../../hardware-sim/board/quadrature.js';
import { TestHost } from './testHost.js';

// Source: the four-state table that data sheets of quadrature counters print (HCTL-2016: states
// A B = 10, 11, 01, 00 in turn count up, the other way round down); from memory. The rows with no
// change and with both lines changed follow from it.
const TABLE: [from: string, to: string, step: number][] = [
  ['00', '00', 0],
  ['00', '01', -1],
  ['00', '10', 1],
  ['00', '11', ILLEGAL],
  ['01', '00', 1],
  ['01', '01', 0],
  ['01', '10', ILLEGAL],
  ['01', '11', -1],
  ['10', '00', -1],
  ['10', '01', ILLEGAL],
  ['10', '10', 0],
  ['10', '11', 1],
  ['11', '00', ILLEGAL],
  ['11', '01', 1],
  ['11', '10', -1],
  ['11', '11', 0],
];
const CYCLE = ['10', '11', '01', '00'];
const levels = (pair: string) => [...pair].map(Number) as [0 | 1, 0 | 1];

describe('the encoder', () => {
  test.each(TABLE)('takes A B from %s to %s as %i', (from, to, step) => {
    const decoder = new QuadratureDecoder();
    // Comes to `from` by legal steps only.
    for (const pair of CYCLE) {
      decoder.next(...levels(pair));
      if (pair === from) break;
    }
    expect(decoder.next(...levels(to))).toBe(step);
  });

  test('counts four a cycle, up and down again', () => {
    const { board } = new TestHost();
    for (let cycle = 0; cycle < 25; cycle++) {
      for (const pair of CYCLE) board.setQuadrature(...levels(pair));
    }
    expect(board.count).toBe(100);
    for (const pair of ['01', '11', '10', '00']) board.setQuadrature(...levels(pair));
    expect(board.count).toBe(96);
  });

  test('follows any legal walk exactly', () => {
    fc.assert(
      fc.property(fc.array(fc.boolean(), { maxLength: 400 }), (walk) => {
        const { board } = new TestHost();
        let place = 3;
        let count = 0;
        for (const up of walk) {
          place = (place + (up ? 1 : 3)) % 4;
          count += up ? 1 : -1;
          board.setQuadrature(...levels(CYCLE[place]!));
        }
        expect(board.count).toBe(count);
      }),
      { seed: 51, numRuns: 100 },
    );
  });

  test('counts an illegal transition, tells it, and goes on from the new levels', () => {
    const host = new TestHost();
    host.board.setQuadrature(1, 1);
    expect(host.board.count).toBe(0);
    host.board.setQuadrature(0, 1);
    expect(host.board.count).toBe(1);
    host.silent(1000);
    expect(host.samples.at(-1)).toMatchObject({ count: 1, illegal: 1 });
  });
});
