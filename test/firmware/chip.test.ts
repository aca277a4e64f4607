/**
 * The emulator's parts, each by a program of a few words, against the data sheet of the
 * ATmega48A/PA/88A/PA/168A/PA/328/P (DS40002061); chapters are named from memory.
 */
import { describe, expect, test } from 'vitest';
import { Chip } from '../../hardware-sim/emulator/chip.js';
import { ATMEGA328P } from '../../hardware-sim/emulator/chipLayout.js';

const NOP = 0x0000;
const SEI = 0x9478;
const RJMP_SELF = 0xcfff;
const RETI = 0x9518;
const ldi = (register: number, value: number) =>
  0xe000 | ((value & 0xf0) << 4) | ((register - 16) << 4) | (value & 0x0f);
const sts = (address: number, register: number) => [0x9200 | (register << 4), address];
const set = (address: number, value: number) => [ldi(16, value), ...sts(address, 16)];

/** A chip with this program at its beginning; vectors lie over it, so it jumps to word 0x40 first. */
function chip(program: readonly number[], handlers: Record<number, readonly number[]> = {}): Chip {
  const words = new Uint16Array(ATMEGA328P.flashWords).fill(NOP);
  words[0] = 0xc03f;
  words.set(program, 0x40);
  for (const [address, words2] of Object.entries(handlers)) words.set(words2, Number(address));
  return new Chip(words, ATMEGA328P);
}

const TIMER = {
  tccr1b: 0x81,
  tcnt1h: 0x85,
  tcnt1l: 0x84,
  ocr1ah: 0x89,
  ocr1al: 0x88,
  timsk1: 0x6f,
};
const OCF1A = 2;
const TIFR1 = 0x36;

describe('timer 1', () => {
  test('counts at an eighth of the clock, and flags a match as the count leaves it', () => {
    const one = chip([
      ...set(TIMER.ocr1ah, 0),
      ...set(TIMER.ocr1al, 10),
      ...set(TIMER.tccr1b, 2),
      RJMP_SELF,
    ]);
    one.run(20);
    const from = one.timer1.startedAt;
    one.run(Math.floor(from / 8) * 8 + 8 * 11 - 2);
    expect(one.timer1.count).toBe(10);
    expect(one.cpu.data[TIFR1]! & OCF1A).toBe(0);
    one.run(Math.floor(from / 8) * 8 + 8 * 11);
    expect(one.cpu.data[TIFR1]! & OCF1A).toBe(OCF1A);
  });

  test('clears only the flags that a one is written to', () => {
    const one = chip([...set(TIMER.tccr1b, 1), RJMP_SELF]);
    one.run(140_000);
    expect(one.cpu.data[TIFR1]! & 7).toBe(7);
    one.cpu.writeData(TIFR1, OCF1A);
    expect(one.cpu.data[TIFR1]! & 7).toBe(5);
  });
});

describe('interrupts', () => {
  test('are entered in four cycles, and let one instruction through after RETI', () => {
    const INT0 = 2;
    const one = chip([...set(0x69, 1), ...set(0x3d, 1), SEI, RJMP_SELF], { [INT0]: [RETI] });
    one.run(30);
    const before = one.cpu.cycles;
    one.pins.drive('D', 2, 1);
    one.run(before + 1);
    // The jump that was being done, two cycles, and the entry: the handler is next.
    expect(one.cpu.cycles - before).toBe(6);
    expect(one.cpu.pc).toBe(INT0);
    one.pins.drive('D', 2, 0);
    one.run(one.cpu.cycles + 1);
    expect(one.cpu.pc).not.toBe(INT0);
    one.run(one.cpu.cycles + 1);
    expect(one.cpu.pc).toBe(INT0);
  });

  test('are latched while masked, and served when they are let in', () => {
    const one = chip([...set(0x69, 1), SEI, RJMP_SELF], { 2: [RJMP_SELF] });
    one.run(30);
    one.pins.drive('D', 2, 1);
    one.run(60);
    expect(one.cpu.pc).not.toBe(2);
    one.cpu.writeData(0x3d, 1);
    one.run(70);
    expect(one.cpu.pc).toBe(2);
  });
});

describe('the USART', () => {
  /** 500 kbaud: U2X, UBRR 3; receiver on. */
  const listening = () => chip([...set(0xc0, 2), ...set(0xc4, 3), ...set(0xc1, 0x18), RJMP_SELF]);

  test('takes ten bits of 32 cycles for a byte at 500 kbaud', () => {
    const one = listening();
    one.run(30);
    const from = one.cpu.cycles;
    one.usart.receive(Uint8Array.of(0x5a));
    one.run(from + 318);
    expect(one.cpu.data[0xc0]! & 0x80).toBe(0);
    one.run(from + 322);
    expect(one.cpu.data[0xc0]! & 0x80).toBe(0x80);
    expect(one.cpu.readData(0xc6)).toBe(0x5a);
  });

  test('holds two bytes and the one in its shift register, and says when more are lost', () => {
    const one = listening();
    one.run(30);
    one.usart.receive(Uint8Array.of(1, 2, 3, 4));
    one.run(2_000);
    expect(one.usart.lost).toBe(1);
    expect(one.cpu.data[0xc0]! & 0x08).toBe(0x08);
    expect([0, 0, 0].map(() => one.cpu.readData(0xc6))).toEqual([1, 2, 3]);
  });

  test('keeps what it has received over a write to UCSR0B', () => {
    const one = listening();
    one.run(30);
    one.usart.receive(Uint8Array.of(7));
    one.run(500);
    one.cpu.writeData(0xc1, 0x38);
    expect(one.cpu.readData(0xc6)).toBe(7);
  });
});

describe('pins', () => {
  test('toggle where a one is written to PINx, and no others', () => {
    const one = chip([...set(0x27, 0x3f), ...set(0x28, 0x05), ...set(0x26, 0x03), RJMP_SELF]);
    one.run(30);
    expect(one.pins.levels('C')).toBe(0x06);
  });

  test('are pulled up where PORTx says so, until something drives them', () => {
    const one = chip([...set(0x25, 0x03), RJMP_SELF]);
    one.run(30);
    one.pins.drive('B', 1, 0);
    expect(one.pins.levels('B')).toBe(0x01);
  });
});

describe('the watchdog', () => {
  test('resets a chip that does not feed it after 64 ms, and leaves word of it', () => {
    const one = chip([...set(0x60, 0x18), ...set(0x60, 0x0a), RJMP_SELF]);
    let resets = 0;
    one.resetItself = () => resets++;
    one.run(63_000 * 16);
    expect(resets).toBe(0);
    one.run(65_000 * 16);
    expect(resets).toBe(1);
    expect(one.cpu.data[0x54]! & 8).toBe(8);
  });
});
