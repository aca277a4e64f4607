import type { AlarmView } from '../../server/loop/alarms/alarms.js';
import type { Live } from '../model/live.js';
import type { Actions } from './actions.js';
import { HoldButton } from './holdButton.js';
import { LevelShape } from './shapes.js';

/**
 * What is wrong with rig or session, as the loop judges it, each with its remedy. What somebody has
 * seen stays until it is over, in one quiet line.
 */
export function AlarmsPanel({ live, actions }: { live: Live; actions: Actions }) {
  const alarms = live.state?.alarms ?? [];
  const fresh = alarms.filter(({ seenBy }) => seenBy === null);
  const seen = alarms.filter(({ seenBy }) => seenBy !== null);
  return (
    <section class="alarms" aria-label="Alarms">
      <div role="alert" class="alarms-new">
        {fresh.map((one) => (
          <NewAlarm key={one.alarm} alarm={one} alone={fresh.length === 1} actions={actions} />
        ))}
      </div>
      {fresh.length > 1 ? (
        <HoldButton
          holdMs={0}
          shortcut="acknowledge"
          onFire={() => void actions.act({ act: 'acknowledge', alarm: 'all' })}
        >
          All {fresh.length} seen
        </HoldButton>
      ) : null}
      {seen.length > 0 ? (
        <ul class="alarms-seen" aria-label="Alarms that were seen">
          {seen.map((one) => (
            <li key={one.alarm} class={one.level}>
              <LevelShape level={shapeOf(one.level)} />
              <span>
                {tidy(one.text)} <em>seen by {one.seenBy!.who || one.seenBy!.from}</em>
              </span>
            </li>
          ))}
        </ul>
      ) : null}
    </section>
  );
}

function NewAlarm(props: { alarm: AlarmView; alone: boolean; actions: Actions }) {
  const { alarm, alone, actions } = props;
  const { level, text, remedy } = alarm;
  const seen = () => void actions.act({ act: 'acknowledge', alarm: alarm.alarm });
  return (
    <div class={`alarm ${level}`}>
      <LevelShape level={shapeOf(level)} />
      <p>
        <strong>{tidy(text)}</strong> <span>{remedy}</span>
      </p>
      {alone ? (
        <HoldButton holdMs={0} shortcut="acknowledge" onFire={seen}>
          Seen<span class="unseen">: {tidy(text)}</span>
        </HoldButton>
      ) : (
        <button type="button" onClick={seen}>
          Seen<span class="unseen">: {tidy(text)}</span>
        </button>
      )}
    </div>
  );
}

function shapeOf(level: AlarmView['level']): 'bad' | 'warn' | 'off' {
  return level === 'note' ? 'off' : level;
}

function tidy(text: string): string {
  return text.replace(/\buL\b/g, 'µL');
}
