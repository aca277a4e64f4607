import uPlot from 'uplot';
import { type SpeedTrace, TRACE_S } from '../model/trace.js';
import { LEFT_PX, RIGHT_PX } from './axis.js';
import type { Palette } from './palette.js';

/** Speed over the last minute; made anew when the theme changes. */
export class SpeedPlot {
  private plot: uPlot | undefined;
  private readonly observer: ResizeObserver;

  constructor(
    private readonly box: HTMLElement,
    private palette: Palette,
  ) {
    this.observer = new ResizeObserver(() => {
      this.plot?.setSize({ width: box.clientWidth, height: box.clientHeight });
    });
    this.observer.observe(box);
    this.make();
  }

  setPalette(palette: Palette): void {
    this.palette = palette;
    this.plot?.destroy();
    this.make();
  }

  draw(trace: SpeedTrace): void {
    this.plot?.setData(trace.view() as unknown as uPlot.AlignedData);
  }

  release(): void {
    this.observer.disconnect();
    this.plot?.destroy();
  }

  private make(): void {
    const { palette, box } = this;
    const axis = {
      stroke: palette.soft,
      font: `11px ${palette.font}`,
      grid: { stroke: palette.line, width: 1 },
      ticks: { stroke: palette.line, width: 1, size: 4 },
    };
    this.plot = new uPlot(
      {
        width: box.clientWidth,
        height: box.clientHeight,
        padding: [8, RIGHT_PX, 0, 0],
        legend: { show: false },
        cursor: { show: false },
        scales: {
          x: { time: false, range: [-TRACE_S, 0] },
          y: {
            range: (_plot, least, most) => [
              Math.min(0, least ?? 0),
              Math.max(20, most ?? 0) * 1.05,
            ],
          },
        },
        series: [{}, { stroke: palette.accent, width: 1.75, points: { show: false } }],
        axes: [
          {
            ...axis,
            size: 24,
            values: (_plot, ticks) => ticks.map((s) => (s === 0 ? 'now' : `${s} s`)),
          },
          { ...axis, size: LEFT_PX },
        ],
      },
      [[], []],
      box,
    );
  }
}
