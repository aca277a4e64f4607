import { Board } from '../board/board.js';
import { FramedOutput } from '../board/boardOutput.js';
import type { BoardOptions } from '../board/boardSetting.js';
import { EmulatedBoard, type EmulatedBoardOptions } from '../emulator/emulatedBoard.js';
import type { BoardLine } from './boardLine.js';

/** The simulated board on the conformance suite's line. */
export function simulatedLine(options: BoardOptions = {}): BoardLine {
  const board = new Board(options);
  const quadrature: [0 | 1, 0 | 1] = [0, 0];
  let quarter = 0;
  const line: BoardLine = {
    name: 'the simulated board',
    heard: () => {},
    write: (bytes) => board.receiveBytes(bytes),
    async wait(us) {
      board.advanceTo(board.worldUs + us);
    },
    async turn(counts, countsPerS) {
      const fromUs = board.worldUs;
      for (let n = 1; n <= Math.abs(counts); n++) {
        board.advanceTo(fromUs + Math.round((n * 1e6) / countsPerS));
        quarter = (quarter + Math.sign(counts)) & 3;
        quadrature[0] = quarter === 1 || quarter === 2 ? 1 : 0;
        quadrature[1] = quarter >= 2 ? 1 : 0;
        board.setQuadrature(...quadrature);
      }
    },
    jump() {
      quarter = (quarter + 2) & 3;
      quadrature[0] = quadrature[0] === 1 ? 0 : 1;
      quadrature[1] = quadrature[1] === 1 ? 0 : 1;
      board.setQuadrature(...quadrature);
    },
    setInput: (input, level) => board.setInput(input, level),
    pin: (output) => board.pinLevel(output),
  };
  board.connect(new FramedOutput((bytes) => line.heard(bytes)));
  return line;
}

/** The emulated firmware on the conformance suite's line. */
export function emulatedLine(options: EmulatedBoardOptions = {}): BoardLine & {
  readonly board: EmulatedBoard;
} {
  const board = new EmulatedBoard(options);
  const line = {
    name: `the firmware on an emulated ${board.name}`,
    board,
    heard: (_bytes: Uint8Array) => {},
    write: (bytes: Uint8Array) => board.receiveBytes(bytes),
    async wait(us: number) {
      board.advanceTo(board.worldUs + us);
    },
    async turn(counts: number, countsPerS: number) {
      const fromUs = board.worldUs;
      for (let n = 1; n <= Math.abs(counts); n++) {
        board.advanceTo(fromUs + (n * 1e6) / countsPerS);
        board.step(counts > 0 ? 1 : -1);
      }
    },
    jump: () => board.jump(),
    setInput: (input: number, level: 0 | 1) => board.setInput(input, level),
    pin: (output: number): 0 | 1 => (board.outputLevels & (1 << output) ? 1 : 0),
  };
  board.said = (bytes) => line.heard(bytes);
  // The boot loader's place in time: the firmware has started before anyone speaks to it.
  board.advanceTo(60_000);
  return line;
}
