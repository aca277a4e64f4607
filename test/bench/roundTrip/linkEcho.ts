/** The link alone: each rising edge is answered with a pulse, with nothing decided in between. */
import { BoardLink } from '../../../server/link/boardLink.js';
import type { LinkHandler } from '../../../server/link/linkHandler.js';
import { portOpener } from '../../../server/link/resolvePort.js';
import { blank } from '../../../server/wire/codec.js';
import { PROBE_INPUT } from './peer.js';

const WINDOW_US = 20_000;
const REPLY_OUTPUT = 4;
const pulse = { ...blank('pulse'), output: REPLY_OUTPUT, widthUs: 1_000, repeats: 1 };
const beat = blank('beat');
const handler: LinkHandler = {
  sample({ boardUs }) {
    beat.finishedUs = boardUs;
  },
  edge(edge) {
    if (edge.input !== PROBE_INPUT || edge.level !== 1) return;
    pulse.id++;
    pulse.expiryUs = edge.boardUs + WINDOW_US;
    link.send('pulse', pulse);
  },
  outcome() {},
  fault() {},
  clock() {},
  up: () => process.send?.('ready'),
  down() {},
  waiting() {},
  gap() {},
  badFrame() {},
  batchEnd() {},
};
const openPort = portOpener(process.argv[2]!, { baudRate: 500_000 });
const link = new BoardLink({ openPort, handler });
setInterval(() => link.send('beat', beat), 25);
link.start();
