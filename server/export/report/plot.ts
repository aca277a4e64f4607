import { type ScaleLinear, scaleLinear } from 'd3-scale';
import { area, line } from 'd3-shape';

/** Colours that colour-blind readers tell apart, and print in different greys (Okabe and Ito 2008). */
export const INK = {
  black: '#000000',
  blue: '#0072B2',
  orange: '#D55E00',
  green: '#009E73',
  sky: '#56B4E9',
  grey: '#8a8a8a',
} as const;

export interface Axis {
  readonly label: string;
  readonly from: number;
  readonly to: number;
  /** Whole numbers only, as for laps. */
  readonly whole?: boolean;
}
export type Point = readonly [x: number, y: number];

const WIDTH = 700;
const LEFT = 58;
const RIGHT = 14;
const TOP = 18;
const BOTTOM = 40;

/** One figure with two axes, drawn as SVG text: no script, no style sheet. */
export class Plot {
  readonly x: ScaleLinear<number, number>;
  readonly y: ScaleLinear<number, number>;
  readonly #height: number;
  readonly #title: string;
  readonly #axes: readonly [Axis, Axis];
  readonly #parts: string[] = [];

  /** @param title what the figure shows, for those who cannot see it */
  constructor(title: string, x: Axis, y: Axis, height = 220) {
    this.#title = title;
    this.#axes = [x, y];
    this.#height = height;
    this.x = scaleLinear([x.from, x.to === x.from ? x.from + 1 : x.to], [LEFT, WIDTH - RIGHT]);
    this.y = scaleLinear([y.from, y.to === y.from ? y.from + 1 : y.to], [height - BOTTOM, TOP]);
  }

  /** A shaded stretch of the x axis with a word above it. */
  stretch(from: number, to: number, label: string, colour: string): this {
    const [a, b] = [this.x(from), this.x(to)];
    const h = this.#height - BOTTOM - TOP;
    this.#parts.push(
      `<rect x="${n(a)}" y="${TOP}" width="${n(b - a)}" height="${h}" fill="${colour}" opacity="0.16"/>`,
      `<text x="${n((a + b) / 2)}" y="${TOP - 5}" text-anchor="middle" class="small">${escapeHtml(label)}</text>`,
    );
    return this;
  }

  curve(points: readonly Point[], colour: string, dash = ''): this {
    const path = line<Point>()
      .defined(([, y]) => Number.isFinite(y))
      .x(([x]) => n(this.x(x)))
      .y(([, y]) => n(this.y(y)))(points);
    const dashed = dash === '' ? '' : ` stroke-dasharray="${dash}"`;
    this.#parts.push(
      `<path d="${path ?? ''}" fill="none" stroke="${colour}" stroke-width="1.8"${dashed}/>`,
    );
    return this;
  }

  band(points: readonly (readonly [x: number, low: number, high: number])[], colour: string): this {
    // A mean less its spread may lie below the axis.
    const [bottom, most] = [this.#axes[1].from, this.#axes[1].to];
    const inside = (y: number) => n(this.y(Math.min(most, Math.max(bottom, y))));
    const path = area<readonly [number, number, number]>()
      .defined(([, low, high]) => Number.isFinite(low) && Number.isFinite(high))
      .x(([x]) => n(this.x(x)))
      .y0(([, low]) => inside(low))
      .y1(([, , high]) => inside(high))(points);
    this.#parts.push(`<path d="${path ?? ''}" fill="${colour}" opacity="0.18"/>`);
    return this;
  }

  bars(points: readonly Point[], width: number, colour: string): this {
    for (const [x, y] of points) {
      if (!Number.isFinite(y)) continue;
      const [a, b] = [this.x(x - width / 2), this.x(x + width / 2)];
      const top = this.y(y);
      const h = this.y(this.#axes[1].from) - top;
      this.#parts.push(
        `<rect x="${n(a)}" y="${n(top)}" width="${n(b - a)}" height="${n(h)}" fill="${colour}"/>`,
      );
    }
    return this;
  }

  /** Marks of different shapes, so that they can be told apart without colour. */
  marks(points: readonly Point[], shape: 'tick' | 'dot' | 'ring' | 'drop', colour: string): this {
    for (const [x, y] of points) {
      if (!Number.isFinite(x) || !Number.isFinite(y)) continue;
      this.#parts.push(markAt(n(this.x(x)), n(this.y(y)), shape, colour));
    }
    return this;
  }

  toString(): string {
    const h = this.#height;
    const [x, y] = this.#axes;
    const ticks = (axis: Axis, scale: ScaleLinear<number, number>, most: number) =>
      scale.ticks(most).filter((t) => !axis.whole || Number.isInteger(t));
    const base = h - BOTTOM;
    const across = ticks(x, this.x, 10).map((t) => {
      const at = n(this.x(t));
      return `<path d="M${at} ${base}v5" stroke="#000"/><text x="${at}" y="${base + 18}" text-anchor="middle">${t}</text>`;
    });
    const up = ticks(y, this.y, Math.max(2, Math.round(h / 50))).map((t) => {
      const at = n(this.y(t));
      return `<path d="M${LEFT} ${at}h-5" stroke="#000"/><text x="${LEFT - 8}" y="${at + 4}" text-anchor="end">${t}</text>`;
    });
    const middle = (TOP + base) / 2;
    return [
      `<svg viewBox="0 0 ${WIDTH} ${h}" role="img"><title>${escapeHtml(this.#title)}</title>`,
      ...this.#parts,
      `<path d="M${LEFT} ${TOP}V${base}H${WIDTH - RIGHT}" fill="none" stroke="#000"/>`,
      ...across,
      ...up,
      `<text x="${(LEFT + WIDTH - RIGHT) / 2}" y="${h - 5}" text-anchor="middle">${escapeHtml(x.label)}</text>`,
      `<text transform="translate(14 ${middle}) rotate(-90)" text-anchor="middle">${escapeHtml(y.label)}</text>`,
      '</svg>',
    ].join('\n');
  }
}

function markAt(x: number, y: number, shape: string, colour: string): string {
  switch (shape) {
    case 'tick':
      return `<path d="M${x} ${n(y - 3.2)}v6.4" stroke="${colour}" stroke-width="1"/>`;
    case 'ring':
      return `<circle cx="${x}" cy="${y}" r="3.4" fill="#fff" stroke="${colour}" stroke-width="1.4"/>`;
    case 'drop':
      return `<path d="M${x} ${n(y - 4)}l3.4 6h-6.8z" fill="${colour}"/>`;
    default:
      return `<circle cx="${x}" cy="${y}" r="3.4" fill="${colour}"/>`;
  }
}

/** Hundredths of a pixel: finer is noise, and the same on every computer. */
function n(value: number): number {
  return Math.round(value * 100) / 100;
}

export function escapeHtml(text: string): string {
  return text
    .replaceAll('&', '&amp;')
    .replaceAll('<', '&lt;')
    .replaceAll('>', '&gt;')
    .replaceAll('"', '&quot;');
}
