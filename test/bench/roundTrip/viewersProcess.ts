/**
 * Takes what the stream sends, for as many pages as the parent wants, and does nothing with it. It
 * stands for other machines, so it takes only the time that the service leaves.
 */
import { constants, getPriority, setPriority } from 'node:os';
import { WebSocket } from 'ws';

const stream = process.argv[2]!;
const open = new Set<WebSocket>();
let wanted = 0;
let opening = 0;
let heard = { messages: 0, bytes: 0, lost: 0 };
let reached: (() => void) | undefined;
setPriority(Math.min(constants.priority.PRIORITY_LOW, getPriority() + 10));

function settle(): void {
  while (open.size + opening < wanted) openOne();
  for (const socket of [...open].slice(wanted)) {
    open.delete(socket);
    socket.terminate();
  }
  if (open.size === wanted) reached?.();
}

function openOne(): void {
  opening++;
  const socket = new WebSocket(stream, { perMessageDeflate: false });
  let opened = false;
  socket.on('open', () => {
    opened = true;
    opening--;
    open.add(socket);
    settle();
  });
  // The service may not be up yet, or wants its callers one after the other.
  socket.on('error', () => socket.terminate());
  socket.on('close', () => {
    if (open.delete(socket)) heard.lost++;
    if (!opened) opening--;
    setTimeout(settle, 200);
  });
  socket.on('message', (data: Buffer) => {
    heard.messages++;
    heard.bytes += data.length;
  });
}

process.on('message', (question: { watch?: number }) => {
  if (question.watch === undefined) {
    process.send!(heard);
    heard = { messages: 0, bytes: 0, lost: 0 };
    return;
  }
  wanted = question.watch;
  reached = () => {
    reached = undefined;
    process.send!(heard);
  };
  settle();
});
