/** Every canvas of the page, each drawn again only when what it shows has changed. */
import type { Live } from '../model/live.js';
import { drawAnimal, drawBelt } from './belt.js';
import { type Palette, readPalette } from './palette.js';
import { drawLicking, drawProfile } from './profile.js';
import { drawRaster, drawRunning } from './raster.js';
import { SpeedPlot } from './speedPlot.js';
import { Surface } from './surface.js';

const CANVASES = ['belt', 'animal', 'raster', 'running', 'profile', 'licking'] as const;
export type ChartName = (typeof CANVASES)[number];

/** The marker runs on between two states, 50 ms apart, at the speed last told; no further. */
const RUN_ON_MS = 60;
/** The speed trace moves 10 times a second: more cannot be seen, and costs. */
const TRACE_MS = 95;
/** The profile is a mean over laps. */
const PROFILE_MS = 500;

export class Charts {
  private palette: Palette = readPalette();
  private paletteVersion = 0;
  private readonly surfaces = new Map<ChartName, Surface>();
  private readonly drawn = new Map<ChartName, string>();
  private plot: SpeedPlot | undefined;
  private traceVersion = -1;
  private traceMs = 0;
  private profileMs = 0;

  constructor(private readonly wake: () => void) {}

  /** Takes a canvas that was put on the page, or lets go of one that was taken off (null). */
  attach(name: ChartName, canvas: HTMLCanvasElement | null): void {
    this.surfaces.get(name)?.release();
    this.surfaces.delete(name);
    this.drawn.delete(name);
    if (canvas) this.surfaces.set(name, new Surface(canvas, this.wake));
    this.wake();
  }

  attachPlot(box: HTMLElement | null): void {
    this.plot?.release();
    this.plot = box ? new SpeedPlot(box, this.palette) : undefined;
    this.traceVersion = -1;
    this.wake();
  }

  themeChanged(): void {
    this.palette = readPalette();
    this.paletteVersion++;
    this.plot?.setPalette(this.palette);
    this.traceVersion = -1;
    this.wake();
  }

  /** Draws what changed. Returns true when the marker should go on moving by itself. */
  draw(live: Live, nowMs: number, moving: boolean): boolean {
    const { state, setup } = live;
    if (!setup) return false;
    const lengthCm = setup.beltLengthCm;
    const places = state?.places ?? [];
    const placesKey = places.map((p) => `${p.name} ${p.fromCm} ${p.toCm}`).join();
    const runOnMs = moving ? Math.min(nowMs - live.movedAtMs, RUN_ON_MS) : 0;
    const positionCm = runOn(state?.positionCm ?? null, state?.speedCmPerS ?? 0, runOnMs, lengthCm);

    this.paint('belt', placesKey + lengthCm, (surface) =>
      drawBelt(surface, this.palette, lengthCm, places),
    );
    const where = positionCm === null ? 'unknown' : positionCm.toFixed(2);
    const animalKey = `${where} ${state?.speedCmPerS.toFixed(1)} ${state?.trust} ${state?.lickOn}`;
    this.paint('animal', animalKey, (surface) =>
      drawAnimal(surface, this.palette, lengthCm, {
        positionCm,
        speedCmPerS: state?.speedCmPerS ?? 0,
        trusted: state?.trust === 'trusted',
        lickOn: state?.lickOn ?? false,
      }),
    );
    this.paint('raster', `${live.laps.version} ${placesKey}`, (surface) =>
      drawRaster(surface, this.palette, lengthCm, live.laps, places),
    );
    this.paint('running', `${live.laps.newest} ${where}`, (surface) =>
      drawRunning(surface, this.palette, lengthCm, positionCm, live.laps.newest),
    );
    if (nowMs - this.profileMs >= PROFILE_MS) {
      this.profileMs = nowMs;
      this.paint('profile', String(live.profile.version), (surface) =>
        drawProfile(surface, this.palette, live.profile),
      );
      this.paint('licking', String(live.profile.version), (surface) =>
        drawLicking(surface, this.palette, live.profile),
      );
    }
    if (live.trace.version !== this.traceVersion && nowMs - this.traceMs >= TRACE_MS) {
      this.traceMs = nowMs;
      this.traceVersion = live.trace.version;
      this.plot?.draw(live.trace);
    }
    return moving && Math.abs(state?.speedCmPerS ?? 0) > 0.5 && runOnMs < RUN_ON_MS;
  }

  private paint(name: ChartName, content: string, draw: (surface: Surface) => void): void {
    const surface = this.surfaces.get(name);
    if (!surface || surface.width === 0) return;
    const key = `${this.paletteVersion} ${surface.version} ${content}`;
    if (this.drawn.get(name) === key) return;
    this.drawn.set(name, key);
    draw(surface);
  }
}

function runOn(
  positionCm: number | null,
  speedCmPerS: number,
  ms: number,
  lengthCm: number,
): number | null {
  if (positionCm === null) return null;
  const on = positionCm + (speedCmPerS * ms) / 1000;
  // Never over the seam: a lap begins when the loop says so.
  return Math.min(lengthCm, Math.max(0, on));
}
