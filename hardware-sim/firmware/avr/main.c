/* Registers of the 8-bit AVR boards: clock, line, inputs, watchdog, sleep. The encoder is encoder.S. */
#include <avr/eeprom.h>
#include <avr/sleep.h>
#include <avr/wdt.h>
#include "board.h"

#define BAUD 500000UL

volatile uint8_t idle_levels __attribute__((used));
volatile uint16_t illegal_steps __attribute__((used));
static volatile uint32_t overflows; /* of the 16-bit clock, each 32.768 ms */
static volatile uint8_t rx_ring[RX_BYTES], rx_head, rx_tail;
static volatile uint8_t woken; /* an interrupt has left work to the main loop */

/* ---- Time: Timer 1 at 2 MHz, and what it has overflowed */

static uint16_t read_clock(uint32_t *high) {
  cli();
  uint16_t ticks = TCNT1;
  uint32_t overflowed = overflows;
  if ((TIFR1 & _BV(TOV1)) && ticks < 0x8000) overflowed++;
  sei();
  *high = overflowed;
  return ticks;
}

static uint32_t to_us(uint32_t high, uint16_t ticks) {
  uint32_t us = ((uint32_t)(uint16_t)high << 16 | ticks) >> 1;
  return high & 0x10000 ? us | 0x80000000 : us;
}

uint32_t hal_now_us(void) {
  uint32_t high;
  uint16_t ticks = read_clock(&high);
  return to_us(high, ticks);
}

uint32_t hal_now_wraps(uint16_t *wraps) {
  uint32_t high;
  uint16_t ticks = read_clock(&high);
  *wraps = (uint16_t)(high >> 17);
  return to_us(high, ticks);
}

uint32_t hal_extend_ticks(uint16_t ticks) {
  uint32_t high;
  uint16_t now = read_clock(&high);
  /* The 33 bits of half microseconds, set back to when the low 16 were `ticks`. */
  if (ticks > now) high--;
  return to_us(high, ticks);
}

ISR(TIMER1_OVF_vect) { overflows++; }

ISR(TIMER1_COMPA_vect) {
  OCR1A += 2000;
  woken = 1;
  TIMSK1 &= (uint8_t)~_BV(OCIE1A);
  sei();
  board_tick();
  cli();
  TIMSK1 |= _BV(OCIE1A);
}

/* ---- The service, which comes after a hit and after the timer's compare (service.S) */

ISR(SERVICE_VECTOR) {
  bank_held = 1;
  woken = 1;
  do {
    sei();
    bank_service();
    cli();
  } while (bank_wanted || slots_hit_waiting());
  bank_held = 0;
}

/* ---- Inputs: pulled up, active when low, so that a broken wire is an inactive one */

ISR(IN_VECTOR) {
  uint16_t ticks = TCNT1;
  int32_t count = hal_count();
  uint8_t levels = (uint8_t)~IN_PIN & IN_MASK;
  PCICR = 0;
  woken = 1;
  sei();
  board_inputs(levels, hal_extend_ticks(ticks), count);
  cli();
  /* Else there was no room: an input that chatters must take neither the chip nor the line. */
  if (levels == hal_input_levels) PCICR = _BV(IN_CHANGE_ENABLE);
}

/*
 * A thousand times a second: changes that found no room to be told when they happened. They wait
 * until all before them is told, and a sample after it.
 */
static void look_again(void) {
  if (PCICR || !voice_caught_up()) return;
  cli();
  int32_t count = hal_count();
  sei();
  board_inputs((uint8_t)~IN_PIN & IN_MASK, hal_now_us(), count);
  PCICR = _BV(IN_CHANGE_ENABLE);
}

/* ---- The line */

ISR(LINE_RECEIVED) {
  if (UCSR0A & _BV(DOR0)) overruns++;
  uint8_t byte = UDR0, head = rx_head, next = (uint8_t)(head + 1) & (RX_BYTES - 1);
  if (next == rx_tail) {
    overruns++;
  } else {
    rx_ring[head] = byte;
    rx_head = next;
  }
  woken = 1;
}

ISR(LINE_SENT) {
  uint8_t tail = tx_tail;
  if (tail == tx_head) {
    UCSR0B &= (uint8_t)~_BV(UDRIE0);
    return;
  }
  UDR0 = tx_ring[tail];
  tx_tail = (uint8_t)(tail + 1) & (TX_BYTES - 1);
  woken = 1;
}

int16_t hal_receive(void) {
  uint8_t tail = rx_tail;
  if (tail == rx_head) return -1;
  uint8_t byte = rx_ring[tail];
  rx_tail = (uint8_t)(tail + 1) & (RX_BYTES - 1);
  return byte;
}

void hal_send(void) {
  cli();
  UCSR0B |= _BV(UDRIE0);
  sei();
}

/* ---- Watchdog, identity, beginning */

/* The chip's watchdog is fed by the main loop, and only while the tick comes. */
void hal_alive(uint8_t fresh) {
  wdt_reset();
  look_again();
  if (fresh) ALIVE_PIN = _BV(ALIVE_BIT);
}

static const char model[17] PROGMEM = MODEL;
char hal_model(uint8_t i) { return (char)pgm_read_byte(&model[i]); }

static uint8_t cause __attribute__((section(".noinit")));
static uint16_t chance __attribute__((section(".noinit")));

/*
 * Before memory is cleared: why we are here, the watchdog off (it stays on over its own reset), and
 * a little chance out of what the memory held at power-on.
 */
void early(void) __attribute__((naked, used, section(".init3")));
void early(void) {
  cause = MCUSR;
  MCUSR = 0;
  wdt_disable();
  uint16_t fold = 0;
  for (const uint8_t *at = (const uint8_t *)RAMSTART; at < (const uint8_t *)RAMEND; at++) {
    fold = (uint16_t)(fold << 3 | fold >> 13) ^ *at;
  }
  chance = fold;
}

static uint8_t cause_told(void) {
  if (cause & _BV(PORF)) return RESET_POWER_ON;
  if (cause & _BV(BORF)) return RESET_BROWN_OUT;
  if (cause & _BV(WDRF)) return RESET_WATCHDOG;
  return cause & _BV(EXTRF) ? RESET_PIN : RESET_UNKNOWN;
}

/* EEPROM: how often the board has started, and its own number, drawn at the first start. */
#define EEPROM_STARTS ((uint32_t *)0)
#define EEPROM_NUMBER ((uint32_t *)4)

static void draw_ids(void) {
  uint32_t starts = eeprom_read_dword(EEPROM_STARTS) + 1;
  eeprom_update_dword(EEPROM_STARTS, starts);
  uint32_t drawn = (starts ^ (uint32_t)chance << 16) + 0x9e3779b9;
  xorshift32(&drawn);
  xorshift32(&drawn);
  board_id = eeprom_read_dword(EEPROM_NUMBER);
  if (board_id == 0xffffffff) {
    board_id = drawn ? drawn : 1;
    eeprom_update_dword(EEPROM_NUMBER, board_id);
  }
  drawn ^= board_id << 1;
  boot_id = drawn ? drawn : 1;
}

int main(void) {
  /* Outputs are idle (low, until `configure` says otherwise) before their pins become outputs. */
  OUT_PORT &= (uint8_t)~OUT_MASK;
  OUT_DDR |= OUT_MASK;
  ALIVE_DDR |= _BV(ALIVE_BIT);
  IN_PORT |= IN_MASK;
  ENCODER_PORT |= 3 << ENCODER_SHIFT;
  reset_cause = cause_told();
  draw_ids();

  UCSR0A = _BV(U2X0);
  UBRR0 = F_CPU / 8 / BAUD - 1;
  UCSR0C = _BV(UCSZ01) | _BV(UCSZ00);
  UCSR0B = _BV(RXEN0) | _BV(TXEN0) | _BV(RXCIE0);
  TCCR1A = 0;
  TCNT1 = 0;
  OCR1A = 2000;
  OCR1B = 4000;
  TCCR1B = _BV(CS11);
  TIFR1 = _BV(OCF1A) | _BV(OCF1B) | _BV(TOV1);
  TIMSK1 = _BV(OCIE1A) | _BV(OCIE1B) | _BV(TOIE1);
  LEVELS_BEFORE = ENCODER_PIN;
  ENCODER_SENSE();
  hal_input_levels = (uint8_t)~IN_PIN & IN_MASK;
  IN_CHANGES = IN_MASK;
  PCICR = _BV(IN_CHANGE_ENABLE);
  board_begin();
  wdt_enable(WDTO_60MS);
  set_sleep_mode(SLEEP_MODE_IDLE);
  sei();
  for (;;) {
    woken = 0;
    hal_barrier();
    if (board_round()) continue;
    cli();
    if (!woken) {
      sleep_enable();
      sei();
      sleep_cpu();
    }
    sei();
  }
}
