import { setTimeout as delay } from 'node:timers/promises';
import type { ByteLine } from './byteLine.js';
import type { PacedRig } from './pacedRig.js';

/** As a person turns a belt by hand. */
const TURN_CM_PER_S = 25;
const MOST_TOUCHES = 1_000;

export type CommandAnswer = Readonly<Record<string, unknown>>;

/** One command from standard input. @returns what to answer, or `quit` */
export async function runCommand(
  text: string,
  paced: PacedRig,
  line: ByteLine,
): Promise<CommandAnswer | 'quit'> {
  const [name = '', argument = '', speed = ''] = text.trim().split(/\s+/);
  const value = Number(argument);
  const bad = argument === '' || !Number.isFinite(value);
  switch (name) {
    case 'unplug':
      line.unplug();
      return { did: name };
    case 'replug':
      return { did: name, port: await line.replug() };
    case 'reset':
      paced.rig.board.reset();
      paced.flush();
      return { did: name };
    case 'stall':
      if (bad || value < 0) break;
      paced.stall(value);
      return { did: name, ms: value };
    case 'speed':
      if (argument !== 'off' && bad) break;
      paced.rig.forcedCmPerS = argument === 'off' ? undefined : value;
      return { did: name };
    case 'turn':
      if (bad) break;
      paced.rig.turn(value, Number(speed) || TURN_CM_PER_S);
      // Answered when the hand is there; another turn meanwhile takes this one's place.
      while (paced.rig.turning) await delay(20);
      return { did: name };
    case 'tap':
      if (!Number.isInteger(value) || value < 0 || value > 15) break;
      paced.rig.tap(value);
      return { did: name };
    case 'touch':
      if (bad || value < 1) break;
      paced.rig.animal.licking.begin(paced.rig.nowUs, Math.min(MOST_TOUCHES, value));
      return { did: name };
    case 'vial':
      if (argument !== 'on' && argument !== 'off') break;
      paced.rig.vial = argument === 'on';
      paced.rig.vialMg = 0;
      return { did: name };
    case 'weigh':
      return { did: name, mg: Math.round(paced.rig.vialMg * 10) / 10 };
    case 'noise':
      if (bad || value < 0 || value >= 1) break;
      paced.noise = value;
      return { did: name };
    case 'state':
      return { did: name, ...stateOf(paced) };
    case 'quit':
      return 'quit';
  }
  return { error: `Not a command, or not with this value: ${text}` };
}

/** The truth about the rig, for tests and the bench. */
function stateOf({ rig }: PacedRig): CommandAnswer {
  const { board, belt, animal } = rig;
  return {
    boardUs: board.boardUs,
    tag: board.tag,
    outputs: board.outputs,
    rises: rig.rises,
    lap: belt.lap,
    positionCm: belt.positionCm,
    travelCm: belt.travelCm,
    speedCmPerS: rig.forcedCmPerS ?? animal.speedCmPerS,
    drunkUl: animal.drunkUl,
    atSpoutUl: animal.atSpoutUl,
    skill: animal.skill,
  };
}
