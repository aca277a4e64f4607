/*
 * Armed slots. The count moves by one, so the next slot that can be hit in a direction is the one
 * with the nearest target: the encoder's interrupt looks at the head of one list and at nothing
 * else, however many are armed. It takes the head out itself when it is hit, and counts that in
 * `slot_hits`; the rest is done here, with interrupts on.
 */
#include "board.h"

slot_t slots[N_SLOTS] __attribute__((used));
slot_t *volatile slot_heads[2] __attribute__((used));
volatile uint8_t slot_head_lows[2] __attribute__((used));
volatile uint8_t slot_hits __attribute__((used));
uint8_t slot_hits_seen;

/* Counts still to go in the slot's own direction; 0 or less: not ahead any more. */
static int32_t ahead(const slot_t *slot, int32_t count) {
  uint32_t up = (uint32_t)slot->target - (uint32_t)count;
  return (int32_t)(slot->rising ? up : 0 - up);
}

/* Does the count, on its way, come to `a` before `b`? Both are ahead of it. */
static bool comes_before(const slot_t *a, const slot_t *b) {
  int32_t apart = (int32_t)((uint32_t)a->target - (uint32_t)b->target);
  return a->rising ? apart < 0 : apart > 0;
}

/* With interrupts off: a new head for one direction. */
static void set_head(uint8_t rising, slot_t *slot) {
  slot_heads[rising] = slot;
  if (slot) slot_head_lows[rising] = (uint8_t)slot->target;
}

/* Keeps the books of what the interrupt has fired. Those that rose come first: they own. */
void slots_book_hits(void) {
  while (slots_hit_waiting()) {
    slot_hits_seen = slot_hits;
    for (uint8_t rose = 2; rose-- > 0;) {
      for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
        if (slot->state != SLOT_HIT || (slot->rose != 0) != rose) continue;
        slot->state = SLOT_FREE;
        bank_rise_hit(slot, hal_extend_ticks(slot->hit_ticks));
      }
    }
  }
}

/* Puts a slot, filled in but for its place, into its list. False: the target is not ahead. */
bool slot_arm(slot_t *slot) {
  for (;;) {
    slots_take_hits();
    slot_t *before = 0, *after = slot_heads[slot->rising];
    while (after && comes_before(after, slot)) {
      before = after;
      after = after->next;
    }
    slot->next = after;
    hal_irq_off();
    int32_t count = hal_count();
    hal_irq_on();
    if (ahead(slot, count) <= 0) return false;
    hal_irq_off();
    /* All that was found holds as long as the count stands still. */
    bool still = hal_count_low() == (uint8_t)count && !slots_hit_waiting();
    if (still) {
      slot->state = SLOT_ARMED;
      if (before) before->next = slot;
      else set_head(slot->rising, slot);
    }
    hal_irq_on();
    if (still) return true;
  }
}

/* Takes an armed slot out of its list and tells why. One that was hit meanwhile has fired. */
void slot_disarm(slot_t *slot, uint8_t kind, uint8_t reason) {
  for (;;) {
    slots_take_hits();
    if (slot->state != SLOT_ARMED) return;
    slot_t *before = 0, *at = slot_heads[slot->rising];
    while (at && at != slot) {
      before = at;
      at = at->next;
    }
    hal_irq_off();
    if (slots_hit_waiting()) {
      hal_irq_on();
      continue;
    }
    slot->state = SLOT_FREE;
    if (before) before->next = slot->next;
    else set_head(slot->rising, slot->next);
    hal_irq_on();
    voice_outcome_now(slot->id, kind, reason, slot->output);
    return;
  }
}

/* Ends armed slots that are not in `keep` and whose output is in `outputs`. */
void slots_end(uint32_t keep, uint16_t outputs, uint8_t reason) {
  for (uint8_t n = 0; n < N_SLOTS; n++, keep >>= 1) {
    slot_t *slot = &slots[n];
    if (slot->state != SLOT_ARMED || (keep & 1) || !(outputs & 1u << slot->output)) continue;
    slot_disarm(slot, DISARMED, reason);
  }
}

/* Slots left behind. A count that moves by one leaves none; this is for a count that was upset. */
void slots_sweep(void) {
  hal_irq_off();
  int32_t count = hal_count();
  hal_irq_on();
  for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
    if (slot->state != SLOT_ARMED || ahead(slot, count) > 0) continue;
    slots_take_hits();
    slot_disarm(slot, PASSED, R_NONE);
  }
}

bool slots_share_low_byte(int32_t target) {
  for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
    if (slot->state == SLOT_ARMED && (uint8_t)slot->target == (uint8_t)target) return true;
  }
  return false;
}

/* Bit n: a slot is armed to raise output n. */
mask_t slots_armed_outputs(void) {
  mask_t mask = 0;
  for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
    if (slot->state == SLOT_ARMED) mask |= BIT(slot->output);
  }
  return mask;
}

/* Which slots on this output the interrupt may fire by itself, as limits are now. */
void slots_refresh_fast(uint8_t output) {
  for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
    if (slot->state != SLOT_ARMED || slot->output != output) continue;
    slot->fast = output_slot_fast(slot) ? BIT(output) : 0;
  }
}

bool slots_have(uint32_t id) {
  for (slot_t *slot = slots; slot < slots + N_SLOTS; slot++) {
    if (slot->state != SLOT_FREE && slot->id == id) return true;
  }
  return false;
}
