import type { Snapshot } from '../../server/loop/protocol.js';
import { bytesWords, fixed, plural } from './format.js';
import type { Live } from './live.js';

export type Level = 'good' | 'warn' | 'bad' | 'off';

/** One line of health: a word, a level (drawn as shape and colour) and the particulars. */
export interface Health {
  readonly what: string;
  readonly level: Level;
  readonly word: string;
  readonly detail: string;
  readonly remedy: string;
}

/** From the page to the disk, in the order in which a fault hides the ones after it. */
export function healthOf(live: Live): Health[] {
  const { state } = live;
  const lines = [streamHealth(live), loopHealth(live)];
  if (!state) return lines;
  return [...lines, linkHealth(state.link), trustHealth(state), recordHealth(state)];
}

function line(what: string, level: Level, word: string, detail = '', remedy = ''): Health {
  return { what, level, word, detail, remedy };
}

function streamHealth(live: Live): Health {
  if (live.stream === 'open') return line('Page', 'good', 'live', unseenWords(live.unseen));
  return line('Page', 'bad', live.stream === 'opening' ? 'connecting' : 'cut off');
}

function unseenWords(unseen: number): string {
  return unseen > 0 ? `${plural(unseen, 'event')} not shown here (they are in the record)` : '';
}

function loopHealth(live: Live): Health {
  if (!live.loop) return line('Loop', 'off', 'unknown');
  if (live.loop.state === 'up') return line('Loop', 'good', 'running');
  return line('Loop', 'bad', 'away', live.loop.reason, live.loop.remedy);
}

function linkHealth(link: Snapshot['link']): Health {
  const where = [link.board, link.port].filter(Boolean).join(' on ');
  if (link.state !== 'up') {
    const word = link.state === 'down' ? 'lost' : 'connecting';
    return line('Board', 'bad', word, [link.reason, where].filter(Boolean).join('; '), link.remedy);
  }
  const faults = [
    link.lostFrames > 0 ? `${link.lostFrames} lost` : '',
    link.badFrames > 0 ? `${link.badFrames} garbled` : '',
  ].filter(Boolean);
  const frames = `${Math.round(link.framesPerS)} frames/s`;
  const detail = [where, frames, faults.length > 0 ? faults.join(', ') : 'none lost'].join('; ');
  return line('Board', faults.length > 0 ? 'warn' : 'good', 'connected', detail, link.remedy);
}

function trustHealth(state: Snapshot): Health {
  const level = state.trust === 'trusted' ? 'good' : state.trust === 'doubtful' ? 'warn' : 'off';
  return line('Position', level, state.trust, state.trustReason);
}

/** Below this much disk the record is in danger within the day. */
export const LOW_DISK_GB = 5;

function recordHealth({ record }: Snapshot): Health {
  // Not yet known (null in JSON) is not "none".
  const free = record.diskFreeGb as number | null;
  const disk = free === null ? 'free space not known yet' : `${fixed(free, 0)} GB free`;
  if (record.state === 'failed') return line('Record', 'bad', 'failed', record.reason);
  const low = free !== null && free < LOW_DISK_GB;
  if (record.state === 'off') return line('Record', low ? 'warn' : 'off', 'not recording', disk);
  return line('Record', low ? 'warn' : 'good', 'writing', `${bytesWords(record.bytes)}; ${disk}`);
}
