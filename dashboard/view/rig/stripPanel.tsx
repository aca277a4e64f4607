import { useEffect, useRef } from 'preact/hooks';
import type { RigTold } from '../../../server/web/rig/rigMessages.js';
import { readPalette } from '../../draw/palette.js';
import { drawStrip } from '../../draw/strip.js';
import { Surface } from '../../draw/surface.js';
import type { Live } from '../../model/live.js';
import { STRIP_S, type StripLine } from '../../model/strip.js';
import type { Theme } from '../actions.js';
import type { RigDesk } from './rigDesk.js';

/** Inputs and outputs as they change, over the last seconds. */
export function StripPanel(props: { desk: RigDesk; rig: RigTold; live: Live; theme: Theme }) {
  const { desk, rig, live, theme } = props;
  const canvas = useRef<HTMLCanvasElement>(null);
  const now = useRef({ live, rig });
  now.current = { live, rig };
  useEffect(() => {
    const still = matchMedia('(prefers-reduced-motion: reduce)');
    let frame = 0;
    const paint = () => {
      frame = 0;
      const { live, rig } = now.current;
      const lines = linesOf(rig);
      drawStrip(surface, palette, desk.strip, lines, isOnNow(live, rig), performance.now());
      if (!still.matches) schedule();
    };
    const schedule = () => {
      if (frame === 0) frame = requestAnimationFrame(paint);
    };
    const surface = new Surface(canvas.current!, schedule);
    const palette = readPalette();
    desk.onStrip = schedule;
    schedule();
    return () => {
      cancelAnimationFrame(frame);
      surface.release();
      desk.onStrip = () => {};
    };
  }, [theme]);
  const on = isOnNow(live, rig);
  const rows = linesOf(rig);
  return (
    <section class="panel strip-panel" aria-labelledby="strip-title">
      <h2 id="strip-title">Inputs and outputs, the last {STRIP_S} s</h2>
      <canvas
        ref={canvas}
        class={rows.length > 8 ? 'tall' : ''}
        role="img"
        aria-label="Levels of every input and output over the last ten seconds; the list below says what is on now."
      />
      <p class="now-on">
        On now:{' '}
        <b>
          {rows
            .filter(on)
            .map(({ name }) => name)
            .join(', ') || 'nothing'}
        </b>
      </p>
      {desk.benchTrouble === '' ? null : <p class="trouble">{desk.benchTrouble}</p>}
    </section>
  );
}

function linesOf(rig: RigTold): StripLine[] {
  return [
    ...rig.inputs.map(({ name, line }) => ({ name, line, kind: 'input' as const })),
    ...rig.outputs.map(({ name, line, kind }) => ({ name, line, kind })),
  ];
}

/** The state lists lines in the rig file's order. */
function isOnNow({ state }: Live, rig: RigTold): (line: StripLine) => boolean {
  return ({ kind, line }) => {
    const list = kind === 'input' ? rig.inputs : rig.outputs;
    const mask = (kind === 'input' ? state?.inputs : state?.outputs) ?? 0;
    const at = list.findIndex((one) => one.line === line);
    return ((mask >> at) & 1) === 1;
  };
}
