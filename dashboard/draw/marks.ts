import { MARK, type Mark } from '../model/laps.js';
import type { Palette } from './palette.js';

/**
 * Each kind of mark has a shape of its own, so that none is told by colour alone: licks are strokes,
 * water a filled disc, a stimulus a filled diamond, a sham the same one hollow, missed a cross,
 * withheld a hollow square.
 */
export function drawMark(
  ctx: CanvasRenderingContext2D,
  kind: Mark,
  x: number,
  y: number,
  row: number,
  palette: Palette,
): void {
  const r = Math.min(5.5, Math.max(2.2, row * 0.46));
  switch (kind) {
    case MARK.lick:
    case MARK.artefact: {
      const half = Math.min(9, kind === MARK.lick ? row * 0.4 : row * 0.16);
      ctx.fillStyle = palette.lick;
      ctx.fillRect(x - 0.6, y - half, 1.2, half * 2);
      return;
    }
    case MARK.water:
      ctx.fillStyle = palette.water;
      ctx.beginPath();
      ctx.arc(x, y, r * 0.85, 0, Math.PI * 2);
      ctx.fill();
      return;
    case MARK.stimulus:
      diamond(ctx, x, y, r);
      ctx.fillStyle = palette.stim;
      ctx.fill();
      return;
    case MARK.sham:
      diamond(ctx, x, y, r * 0.92);
      ctx.fillStyle = palette.ground;
      ctx.fill();
      ctx.lineWidth = 1.4;
      ctx.strokeStyle = palette.stim;
      ctx.stroke();
      return;
    case MARK.missed:
      ctx.lineWidth = 1.6;
      ctx.strokeStyle = palette.bad;
      ctx.beginPath();
      ctx.moveTo(x - r * 0.8, y - r * 0.8);
      ctx.lineTo(x + r * 0.8, y + r * 0.8);
      ctx.moveTo(x + r * 0.8, y - r * 0.8);
      ctx.lineTo(x - r * 0.8, y + r * 0.8);
      ctx.stroke();
      return;
    case MARK.withheld:
      ctx.lineWidth = 1.4;
      ctx.strokeStyle = palette.warn;
      ctx.strokeRect(x - r * 0.75, y - r * 0.75, r * 1.5, r * 1.5);
      return;
    default:
      return;
  }
}

function diamond(ctx: CanvasRenderingContext2D, x: number, y: number, r: number): void {
  ctx.beginPath();
  ctx.moveTo(x, y - r);
  ctx.lineTo(x + r, y);
  ctx.lineTo(x, y + r);
  ctx.lineTo(x - r, y);
  ctx.closePath();
}
