/* Frames both ways, as in WIRE.md "A frame". Nothing is copied: COBS goes straight into the ring. */
#include "board.h"

volatile uint8_t tx_ring[TX_BYTES], tx_head, tx_tail;
static uint8_t tx_at, tx_code_at, tx_run, tx_sequence;
static uint16_t tx_crc;

/* CRC-16/CCITT-FALSE, one byte on, without a table: all eight bits at once, in steps of 8 bits. */
static inline uint16_t crc_step(uint16_t crc, uint8_t byte) {
  uint8_t x = (uint8_t)(crc >> 8) ^ byte;
  x ^= x >> 4;
  uint8_t high = (uint8_t)crc ^ (uint8_t)(x << 4) ^ (x >> 3), low = (uint8_t)(x << 5) ^ x;
  return (uint16_t)(high << 8 | low);
}

static void stuff(uint8_t byte) {
  if (byte != 0) {
    tx_ring[tx_at] = byte;
    tx_run++;
  } else {
    tx_ring[tx_code_at] = tx_run;
    tx_code_at = tx_at;
    tx_run = 1;
  }
  tx_at = (uint8_t)(tx_at + 1) & (TX_BYTES - 1);
}

/* False when the frame would not fit now; then nothing was begun. */
bool frame_open(uint8_t type, uint16_t frame_tag, uint8_t payload_bytes) {
  uint8_t used = (uint8_t)(tx_head - tx_tail) & (TX_BYTES - 1);
  /* Header 4, CRC 2, one byte of stuffing, the delimiter; a full ring would look empty. */
  if ((uint8_t)(TX_BYTES - 1 - used) < payload_bytes + 8) return false;
  tx_code_at = tx_head;
  tx_at = (uint8_t)(tx_head + 1) & (TX_BYTES - 1);
  tx_run = 1;
  tx_crc = 0xffff;
  frame_8(type);
  frame_8(tx_sequence++);
  frame_16(frame_tag);
  return true;
}

/* The next frame has sequence 0: identity begins a connection. */
void frame_restart(void) { tx_sequence = 0; }

void frame_8(uint8_t value) {
  tx_crc = crc_step(tx_crc, value);
  stuff(value);
}

void frame_16(uint16_t value) {
  frame_8((uint8_t)value);
  frame_8((uint8_t)(value >> 8));
}

void frame_32(uint32_t value) {
  frame_16((uint16_t)value);
  frame_16((uint16_t)(value >> 16));
}

void frame_close(void) {
  uint16_t crc = tx_crc;
  stuff((uint8_t)crc);
  stuff((uint8_t)(crc >> 8));
  tx_ring[tx_code_at] = tx_run;
  tx_ring[tx_at] = 0;
  tx_head = (uint8_t)(tx_at + 1) & (TX_BYTES - 1);
  hal_send();
}

/* The longest that a host sends, stuffed. A longer one is none of ours, and counted as damaged. */
#define STUFFED_MOST (sizeof(pulse_t) + 6 + 1)
static uint8_t rx[STUFFED_MOST], rx_length;
static bool rx_overlong;

/* The unstuffed length, or 0 when the code bytes do not add up. */
static uint8_t unstuff(uint8_t length) {
  uint8_t read = 0, write = 0;
  while (read < length) {
    uint8_t code = rx[read++];
    if (code - 1 > length - read) return 0;
    while (--code) rx[write++] = rx[read++];
    if (read < length) rx[write++] = 0;
  }
  return write;
}

static void end_of_frame(uint8_t stuffed) {
  bool overlong = rx_overlong;
  rx_overlong = false;
  uint8_t length = overlong ? 0 : unstuff(stuffed);
  if (length >= 6) {
    uint16_t crc = 0xffff;
    for (uint8_t i = 0; i < length - 2; i++) crc = crc_step(crc, rx[i]);
    uint8_t payload = length - 6;
    if (rx[length - 2] == (uint8_t)crc && rx[length - 1] == (uint8_t)(crc >> 8) &&
        command_payload_bytes(rx[0]) == payload) {
      command_obey(rx[0], (uint16_t)(rx[2] | (uint16_t)rx[3] << 8), rx + 4);
      return;
    }
  }
  bad_frames++;
}

/* One byte from the host. */
void frame_byte(uint8_t byte) {
  if (byte != 0) {
    if (rx_length < STUFFED_MOST) rx[rx_length++] = byte;
    else rx_overlong = true;
    return;
  }
  uint8_t length = rx_length;
  rx_length = 0;
  if (length > 0) end_of_frame(length);
}
