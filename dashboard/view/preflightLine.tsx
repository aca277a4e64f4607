import { useEffect, useState } from 'preact/hooks';
import type { Preflight } from '../../server/session/preflight.js';
import { preflightStanding } from '../model/begin.js';
import { rigApi } from '../stream/rigApi.js';
import { LevelShape } from './shapes.js';

/** It may be made meanwhile, here or elsewhere. */
const LOOK_MS = 10_000;

/**
 * Whether the rig was checked before this session, and where that is done.
 * @param props.onAgainst told whether a session will want a reason for it
 */
export function PreflightLine(props: {
  simulated: boolean;
  onAgainst: (against: boolean) => void;
}) {
  const [preflight, setPreflight] = useState<Preflight | null>();
  useEffect(() => {
    let gone = false;
    const look = async () => {
      const told = await rigApi.lastPreflight();
      if (!gone && told.done) setPreflight(told.value.preflight);
    };
    void look();
    const timer = setInterval(() => void look(), LOOK_MS);
    return () => {
      gone = true;
      clearInterval(timer);
    };
  }, []);
  const { level, words, against } = preflightStanding(preflight, props.simulated);
  useEffect(() => props.onAgainst(against), [against]);
  if (preflight === undefined) return null;
  return (
    <p class="preflight-line">
      <LevelShape level={level} /> {words}{' '}
      <a href="#rig">{preflight === null ? 'Check the rig' : 'See it'}</a>
    </p>
  );
}
