/** The sign-in page: its one form, and the way on for who is signed in already. */
import type { Problem } from '../server/web/streamMessages.js';

const form = document.getElementById('sign-in') as HTMLFormElement;
const button = form.querySelector('button')!;
const trouble = document.getElementById('trouble')!;
const secret = document.getElementById('secret') as HTMLInputElement;
const show = document.getElementById('show') as HTMLInputElement;

/** A link from elsewhere comes without the cookie, and so ends here: the cookie may be there all the same. */
async function goOnIfSignedIn(): Promise<void> {
  const answer = await fetch('/api/me').catch(() => undefined);
  if (answer?.ok) location.replace('/');
}

async function signIn(): Promise<void> {
  const fields = new FormData(form);
  button.disabled = true;
  trouble.textContent = '';
  const refusal = await ask({ name: fields.get('name'), secret: fields.get('secret') });
  button.disabled = false;
  if (refusal === undefined) {
    location.replace('/');
    return;
  }
  trouble.textContent = refusal;
  secret.select();
  secret.focus();
}

/** What went wrong; undefined when nothing did. */
async function ask(body: object): Promise<string | undefined> {
  try {
    const answer = await fetch('/api/sign-in', {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify(body),
    });
    if (answer.ok) return undefined;
    const { detail, remedy } = (await answer.json()) as Problem;
    return `${detail} ${remedy}`;
  } catch {
    return 'The service cannot be reached. Is Lapwing running at the rig?';
  }
}

form.addEventListener('submit', (event) => {
  event.preventDefault();
  void signIn();
});
show.addEventListener('change', () => {
  secret.type = show.checked ? 'text' : 'password';
});
const here = ['localhost', '127.0.0.1', '[::1]'].includes(location.hostname);
document.getElementById('open-air')!.hidden = here || location.protocol === 'https:';
form.querySelector('input')!.focus();
void goOnIfSignedIn();
