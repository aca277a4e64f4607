import { useRef, useState } from 'preact/hooks';
import type { Field } from '../../../server/calibrate/guides/guide.js';
import type { GuideTold, RigTold } from '../../../server/web/rig/rigMessages.js';
import { ChecksList } from './checksList.js';
import { PictureView } from './pictures.js';
import type { RigDesk } from './rigDesk.js';

const NAMES: Readonly<Record<string, string>> = {
  preflight: 'Pre-flight',
  belt: 'Calibrate the belt',
  valve: 'Calibrate a valve',
  'valve check': 'Weekly check of a valve',
  lick: 'Calibrate the lick sensor',
  latency: 'Measure latency',
};

/** Begins a guide, and leads through the one that goes on. */
export function GuidePanel(props: { desk: RigDesk; rig: RigTold; running: boolean }) {
  const { desk, rig, running } = props;
  const { guide } = desk;
  return (
    <section class="panel guide-panel" aria-labelledby="guide-title">
      <h2 id="guide-title">
        {guide.state === 'none' ? 'Before a session' : `${NAMES[guide.guide]} ${guide.of}`}
      </h2>
      {guide.state === 'none' ? <Choice desk={desk} rig={rig} running={running} /> : null}
      {guide.state === 'going' || guide.state === 'asking' ? (
        <Going desk={desk} guide={guide} />
      ) : null}
      {guide.state === 'done' ? <Done desk={desk} guide={guide} /> : null}
      {guide.state === 'failed' ? (
        <div role="alert">
          <p class="failed-words">{guide.detail}</p>
          <p>{guide.remedy}</p>
          <button type="button" onClick={() => void desk.stop()}>
            Understood
          </button>
        </div>
      ) : null}
    </section>
  );
}

function Choice({ desk, rig, running }: { desk: RigDesk; rig: RigTold; running: boolean }) {
  const valves = rig.outputs.filter(({ kind }) => kind === 'valve').map(({ name }) => name);
  const [valve, setValve] = useState(valves[0] ?? '');
  if (running) return <p class="empty">A session is running: measure before or after it.</p>;
  return (
    <div class="guide-choice">
      <button type="button" class="primary" onClick={() => void desk.begin('preflight')}>
        Pre-flight, a minute
      </button>
      <button type="button" onClick={() => void desk.begin('belt')}>
        Calibrate the belt
      </button>
      <button type="button" onClick={() => void desk.begin('lick')}>
        Calibrate the lick sensor
      </button>
      <button type="button" onClick={() => void desk.begin('latency')}>
        Measure latency
      </button>
      {valves.length === 0 ? null : (
        <div class="valve-choice">
          {valves.length > 1 ? (
            <label>
              Valve
              <select value={valve} onChange={(event) => setValve(event.currentTarget.value)}>
                {valves.map((name) => (
                  <option key={name}>{name}</option>
                ))}
              </select>
            </label>
          ) : null}
          <button type="button" onClick={() => void desk.begin('valve', valve)}>
            Calibrate {valve}
          </button>
          <button type="button" onClick={() => void desk.begin('valve check', valve)}>
            Weekly check of {valve}
          </button>
        </div>
      )}
    </div>
  );
}

function Going(props: { desk: RigDesk; guide: Extract<GuideTold, { state: 'going' | 'asking' }> }) {
  const { desk, guide } = props;
  const { view, question, number } = guide;
  return (
    <div class="going">
      {view.caution === undefined ? null : <p class="caution">{view.caution}</p>}
      <div role="status">
        {view.text.split('\n').map((line) => (
          <p key={line} class={line.startsWith('Look: ') ? 'look' : ''}>
            {line}
          </p>
        ))}
      </div>
      {view.done === null ? null : (
        <progress max={1} value={view.done} aria-label="How far it has come" />
      )}
      {question === null ? null : <Ask key={number} desk={desk} guide={guide} />}
      {view.checks === undefined ? null : <ChecksList checks={view.checks} />}
      {view.pictures.map((picture) => (
        <PictureView key={picture.title} picture={picture} />
      ))}
      <button type="button" class="stop-guide" onClick={() => void desk.stop()}>
        Stop; keep nothing
      </button>
    </div>
  );
}

/** One question; enter goes on. */
function Ask(props: { desk: RigDesk; guide: Extract<GuideTold, { state: 'going' | 'asking' }> }) {
  const { desk, guide } = props;
  const { question, number } = guide;
  const form = useRef<HTMLFormElement>(null);
  const { fields, go } = question!;
  const send = () => {
    const given = new FormData(form.current!);
    const answers: Record<string, number | string> = {};
    for (const field of fields) {
      const text = String(given.get(field.name) ?? '');
      answers[field.name] = field.kind === 'number' ? Number(text) : text;
    }
    void desk.answer(number, answers);
  };
  return (
    <form
      ref={form}
      class="ask"
      onSubmit={(event) => {
        event.preventDefault();
        send();
      }}
    >
      {fields.map((field) => (
        <FieldRow key={field.name} field={field} />
      ))}
      <button type="submit" class="primary">
        {go}
      </button>
    </form>
  );
}

function FieldRow({ field }: { field: Field }) {
  const { name, label } = field;
  if (field.kind === 'choice') {
    return (
      <label>
        {label}
        <select name={name} defaultValue={field.value}>
          {field.options.map((option) => (
            <option key={option} selected={option === field.value}>
              {option}
            </option>
          ))}
        </select>
      </label>
    );
  }
  if (field.kind === 'text') {
    return (
      <label>
        {label}
        <input type="text" name={name} defaultValue={field.value} maxLength={500} />
      </label>
    );
  }
  return (
    <label>
      {label}
      <span class="with-unit">
        <input
          type="number"
          name={name}
          defaultValue={field.value === undefined ? '' : String(field.value)}
          min={field.least}
          max={field.most}
          step="any"
          required
        />
        <span class="soft">{field.unit}</span>
      </span>
    </label>
  );
}

function Done({ desk, guide }: { desk: RigDesk; guide: Extract<GuideTold, { state: 'done' }> }) {
  const { view, kept, usable } = guide;
  return (
    <div class="going">
      <div role="status">
        {view.text.split('\n').map((line) => (
          <p key={line} class={line.startsWith('Look: ') ? 'look' : ''}>
            {line}
          </p>
        ))}
        {kept === null ? null : (
          <p>
            Kept as <b>{kept.name}</b>.
          </p>
        )}
      </div>
      {view.checks === undefined ? null : <ChecksList checks={view.checks} />}
      {view.pictures.map((picture) => (
        <PictureView key={picture.title} picture={picture} />
      ))}
      <div class="row-of-buttons">
        {kept !== null && usable ? (
          <button
            type="button"
            class="primary"
            onClick={() => void desk.use(kept.name).then(() => desk.stop())}
          >
            Put it in force
          </button>
        ) : null}
        <button type="button" onClick={() => void desk.stop()}>
          Close
        </button>
      </div>
    </div>
  );
}
