import type { JobTold } from '../../../server/web/jobs/jobMessages.js';
import { isUnended, jobWords } from '../../model/records.js';
import type { RecordsDesk } from './recordsDesk.js';

/** How far a piece of work is, with a way to cancel it; why it failed. Nothing of one that is done. */
export function JobLine(props: { desk: RecordsDesk; job: JobTold | undefined; what: string }) {
  const { desk, job, what } = props;
  if (!job || job.state === 'done') return null;
  if (isUnended(job)) {
    const done = job.state === 'running' ? job.done : 0;
    return (
      <div class="progress job-line">
        <progress aria-label={what} {...(done > 0 ? { max: 1, value: done } : {})} />
        <span class="job-words" role="status">
          {jobWords(job)}
        </span>
        <button type="button" aria-label={`Cancel: ${what}`} onClick={() => void desk.cancel(job)}>
          Cancel
        </button>
      </div>
    );
  }
  return (
    <p class={`job-line ${job.state === 'failed' ? 'problem' : 'soft'}`} role="status">
      {what}: {jobWords(job)} {job.state === 'failed' ? job.remedy : ''}
    </p>
  );
}
