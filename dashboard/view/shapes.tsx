import type { Level } from '../model/health.js';
import { MARK, type Mark } from '../model/laps.js';

/** A level as a shape: disc good, triangle warning, square bad, ring off. Never colour alone. */
export function LevelShape({ level }: { level: Level }) {
  return (
    <svg class={`shape ${level}`} viewBox="0 0 16 16" aria-hidden="true">
      {level === 'good' && <circle cx="8" cy="8" r="6" />}
      {level === 'warn' && <path d="M8 1.5 15 14.5H1z" />}
      {level === 'bad' && <rect x="2" y="2" width="12" height="12" />}
      {level === 'off' && <circle cx="8" cy="8" r="5" class="hollow" />}
    </svg>
  );
}

/** The raster's marks as its legend shows them; the same shapes as draw/marks.ts. */
export function MarkShape({ kind }: { kind: Mark }) {
  return (
    <svg class="shape mark" viewBox="0 0 16 16" aria-hidden="true">
      {kind === MARK.lick && <rect x="7" y="2" width="2" height="12" class="lick" />}
      {kind === MARK.water && <circle cx="8" cy="8" r="5" class="water" />}
      {kind === MARK.stimulus && <path d="M8 1.5 14.5 8 8 14.5 1.5 8z" class="stim" />}
      {kind === MARK.sham && <path d="M8 2 14 8 8 14 2 8z" class="stim hollow" />}
      {kind === MARK.missed && <path d="M3 3 13 13M13 3 3 13" class="bad hollow" />}
      {kind === MARK.withheld && <rect x="3" y="3" width="10" height="10" class="warn hollow" />}
    </svg>
  );
}

export function Crest() {
  return (
    <svg class="crest" viewBox="0 0 32 32" aria-hidden="true">
      <path d="M3 24c4-9 11-12 18-11 2-4 4-8 8-9-1 4-3 8-5 10 1 7-4 13-12 13-4 0-7-1-9-3z" />
      <circle cx="20.5" cy="17.5" r="1.7" class="eye" />
    </svg>
  );
}
