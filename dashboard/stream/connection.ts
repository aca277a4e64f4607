import type { StreamMessage } from '../../server/web/streamMessages.js';

const FIRST_RETRY_MS = 300;
const MOST_RETRY_MS = 1000;
/** States come 20 times a second while the loop is up, pings every 15 s else. */
const OPEN_TIMEOUT_MS = 5000;

export interface ConnectionHandlers {
  message(message: StreamMessage): void;
  status(status: 'opening' | 'open' | 'lost'): void;
  /** The newest event number that the page has, and of which life of the loop. */
  after(): { number: number; life: string };
}

/** Keeps one stream open for the page's whole life; after a loss it asks only for what is missing. */
export class Connection {
  private socket: WebSocket | undefined;
  private retryMs = FIRST_RETRY_MS;

  constructor(
    private readonly url: string,
    private readonly handlers: ConnectionHandlers,
  ) {}

  open(): void {
    const after = this.handlers.after();
    const query = `?after=${after.number}&life=${encodeURIComponent(after.life)}`;
    const socket = new WebSocket(after.number > 0 ? this.url + query : this.url);
    this.socket = socket;
    const patience = setTimeout(() => socket.close(), OPEN_TIMEOUT_MS);
    socket.onopen = () => {
      clearTimeout(patience);
      this.retryMs = FIRST_RETRY_MS;
      this.handlers.status('open');
    };
    socket.onmessage = (event) => {
      this.handlers.message(JSON.parse(String(event.data)) as StreamMessage);
    };
    socket.onclose = () => {
      clearTimeout(patience);
      if (this.socket !== socket) return;
      this.socket = undefined;
      this.handlers.status('lost');
      setTimeout(() => this.open(), this.retryMs);
      this.retryMs = Math.min(this.retryMs * 1.7, MOST_RETRY_MS);
    };
  }

  /** Asks to stop everything over the stream; false when there is none. */
  askQuiet(): boolean {
    if (this.socket?.readyState !== WebSocket.OPEN) return false;
    this.socket.send('{"ask":"quiet"}');
    return true;
  }
}
