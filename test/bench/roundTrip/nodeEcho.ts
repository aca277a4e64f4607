/** The same as echo.c, with serialport's own stream: what a plain Node program would do. */
import { SerialPort } from 'serialport';

const EDGE = 0x03;
const PULSE_BYTES = 40;
const reply = Buffer.alloc(PULSE_BYTES, 0x55);
reply[PULSE_BYTES - 1] = 0;

const port = new SerialPort({ path: process.argv[2]!, baudRate: 500_000 });
let place = 0;
let edges = 0;
port.on('data', (bytes: Buffer) => {
  for (const byte of bytes) {
    if (byte === 0) place = 0;
    else if (++place === 2 && byte === EDGE && ++edges % 2 === 1) port.write(reply);
  }
});
port.on('open', () => process.send?.('ready'));
