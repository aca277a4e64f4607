import type { ByteLine } from './byteLine.js';
import type { PacedRig } from './pacedRig.js';

export type CommandAnswer = Readonly<Record<string, unknown>>;

/** One command from standard input. @returns what to answer, or `quit` */
export async function runCommand(
  text: string,
  paced: PacedRig,
  line: ByteLine,
): Promise<CommandAnswer | 'quit'> {
  const [name = '', argument = ''] = text.trim().split(/\s+/);
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
