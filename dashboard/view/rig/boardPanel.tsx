import type { PortsTold } from '../../../server/web/rig/rigMessages.js';
import type { Live } from '../../model/live.js';
import { LevelShape } from '../shapes.js';
import type { RigDesk } from './rigDesk.js';

/** The board that answers, and what else is plugged in. */
export function BoardPanel({ desk, live }: { desk: RigDesk; live: Live }) {
  const link = live.state?.link;
  const up = link?.state === 'up';
  return (
    <section class="panel board-panel" aria-labelledby="board-title">
      <h2 id="board-title">Board and ports</h2>
      <p class="board-now">
        <LevelShape level={up ? 'good' : 'bad'} />
        {up ? (
          <span>
            <b>{link.board}</b> at {link.port}, {Math.round(link.framesPerS)} frames a second,{' '}
            {link.badFrames} bad and {link.lostFrames} lost
          </span>
        ) : (
          <span>
            <b>No board answers.</b> {link?.reason} {link?.remedy}
          </span>
        )}
      </p>
      <Ports ports={desk.ports} />
      <button type="button" onClick={() => void desk.lookAtPorts()}>
        Look again
      </button>
    </section>
  );
}

function Ports({ ports }: { ports: PortsTold | undefined }) {
  if (ports === undefined) return <p class="empty">Looking at the ports.</p>;
  if (ports.ports.length === 0) {
    return <p class="empty">No serial device is plugged in.</p>;
  }
  return (
    <ul class="ports">
      {ports.ports.map((port) => (
        <li key={port.path}>
          <b>{port.path}</b>
          <p class="soft">
            {[port.maker, port.product].filter((part) => part !== null).join(' ') ||
              'a serial port'}
            {port.usedBy === null ? ', not in use' : `, in use by ${port.usedBy.program}`}
          </p>
          {port.warnings.map(({ text, remedy }) => (
            <p key={text} class="look">
              {text} {remedy}
            </p>
          ))}
        </li>
      ))}
      {ports.warnings.map(({ text, remedy }) => (
        <li key={text} class="look">
          {text} {remedy}
        </li>
      ))}
    </ul>
  );
}
