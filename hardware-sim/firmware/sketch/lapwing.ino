/*
 * Lapwing's firmware as a sketch, for boards that have no layer of their own. FIRMWARE.md says what
 * such a board can and cannot promise; it is not a safety interlock.
 */
extern "C" {
#include "board.h"
void sketch_setup(uint32_t chance);
void sketch_loop(void);

int16_t hal_receive(void) { return (int16_t)Serial.read(); }

/* As much as the line takes now; the loop comes again. */
void hal_send(void) {
  while (tx_tail != tx_head && Serial.availableForWrite() > 0) {
    Serial.write(tx_ring[tx_tail]);
    tx_tail = (uint8_t)((tx_tail + 1) & (TX_BYTES - 1));
  }
}
}

void setup() {
  Serial.begin(500000);
  uint32_t chance = 0;
  for (uint8_t n = 0; n < 32; n++) chance = chance << 1 ^ (uint32_t)analogRead(A4);
  sketch_setup(chance);
}

void loop() { sketch_loop(); }
