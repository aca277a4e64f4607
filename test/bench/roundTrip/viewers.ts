/** So many pages watching a service, without the pages: takes what the stream sends. */
import { WebSocket } from 'ws';

const [url, wanted] = [process.argv[2]!, Number(process.argv[3])];
let open = 0;

function watch(): void {
  const socket = new WebSocket(url);
  socket.on('open', () => {
    if (++open === wanted) process.send?.('ready');
  });
  // The service may not be up yet.
  socket.on('error', () => setTimeout(watch, 200));
  socket.on('message', () => {});
}
for (let n = 0; n < wanted; n++) watch();
