import { useEffect, useState } from 'preact/hooks';
import type { Preflight } from '../../server/session/preflight.js';
import { rigApi } from '../stream/rigApi.js';
import { LevelShape } from './shapes.js';

/** Whether the rig was checked before this session, and where that is done. */
export function PreflightLine() {
  const [preflight, setPreflight] = useState<Preflight | null>();
  useEffect(() => {
    let gone = false;
    void rigApi.lastPreflight().then((told) => {
      if (!gone && told.done) setPreflight(told.value.preflight);
    });
    return () => {
      gone = true;
    };
  }, []);
  if (preflight === undefined) return null;
  if (preflight === null) {
    return (
      <p class="preflight-line">
        <LevelShape level="warn" /> No pre-flight in the last twelve hours.{' '}
        <a href="#rig">Check the rig</a>
      </p>
    );
  }
  const failed = preflight.checks.filter(({ result }) => result === 'failed').length;
  const at = new Date(preflight.madeAt).toLocaleTimeString([], {
    hour: '2-digit',
    minute: '2-digit',
  });
  return (
    <p class="preflight-line">
      <LevelShape level={preflight.passed ? 'good' : 'bad'} /> Pre-flight at {at}:{' '}
      {preflight.passed ? 'ready' : `${failed} failed`}. <a href="#rig">See it</a>
    </p>
  );
}
