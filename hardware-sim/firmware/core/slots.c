/*
 * Armed slots. The count moves by one, so the next slot that can be hit in a direction is the one
 * with the nearest target: the encoder's interrupt looks at the head of one list and at nothing
 * else, however many are armed. It takes the head out itself when it is hit; the rest is done here,
 * with interrupts on. Nothing else moves a head while a hit waits to be booked, so what was hit is
 * what lies between the head as it was known and the head as it is.
 */
#include "board.h"

slot_t *volatile slot_heads[2] __attribute__((used));
volatile uint8_t slot_head_lows[2] __attribute__((used));
slot_t *slot_heads_known[2];
order_t orders[N_SLOTS];
#define END (&slots[N_SLOTS]) /* raises nothing, and is followed by itself: a hit of it changes nothing */

/* With interrupts off: a new head for one direction. */
static void set_head(uint8_t rising, slot_t *slot) {
  slot_heads[rising] = slot_heads_known[rising] = slot;
  slot_head_lows[rising] = (uint8_t)slot->target;
}

void slots_begin(void) {
  END->next = END;
  set_head(0, END);
  set_head(1, END);
}

static order_t *order_of(const slot_t *slot) { return &orders[slot - slots]; }

/* Counts still to go in the slot's own direction; 0 or less: not ahead any more. */
static int32_t ahead(uint8_t n, int32_t count) {
  uint32_t up = (uint32_t)slots[n].target - (uint32_t)count;
  return (int32_t)(orders[n].rising ? up : 0 - up);
}

/* Does the count, on its way, come to `a` before `b`? Both are ahead of it. */
static bool comes_before(const slot_t *a, const slot_t *b, uint8_t rising) {
  int32_t apart = (int32_t)((uint32_t)a->target - (uint32_t)b->target);
  return rising ? apart < 0 : apart > 0;
}

/* Keeps the books of what the interrupt has fired. Those that rose come first: they own. */
void slots_book_hits(void) {
  while (slots_hit_waiting()) {
    slot_t *from[2], *to[2];
    for (uint8_t rising = 0; rising < 2; rising++) {
      from[rising] = slot_heads_known[rising];
      to[rising] = slot_heads_known[rising] = slot_heads[rising];
    }
    for (uint8_t rose = 2; rose-- > 0;) {
      for (uint8_t rising = 0; rising < 2; rising++) {
        for (slot_t *slot = from[rising]; slot != to[rising]; slot = slot->next) {
          if ((slot->rose != 0) != rose) continue;
          order_t *order = order_of(slot);
          order->armed = 0;
          bank_rise_hit(slot, order);
        }
      }
    }
  }
}

/* Puts a slot, filled in but for its place, into its list. False: the target is not ahead. */
bool slot_arm(uint8_t n) {
  slot_t *slot = &slots[n];
  uint8_t rising = orders[n].rising;
  for (;;) {
    slots_take_hits();
    slot_t *before = 0, *after = slot_heads[rising];
    while (after != END && comes_before(after, slot, rising)) {
      before = after;
      after = after->next;
    }
    slot->next = after;
    hal_irq_off();
    int32_t count = hal_count();
    hal_irq_on();
    if (ahead(n, count) <= 0) return false;
    hal_irq_off();
    /* All that was found holds as long as the count stands still. */
    bool still = hal_count_low() == (uint8_t)count && !slots_hit_waiting();
    if (still) {
      if (before) before->next = slot;
      else set_head(rising, slot);
    }
    hal_irq_on();
    if (!still) continue;
    orders[n].armed = 1;
    return true;
  }
}

/* Takes an armed slot out of its list and tells why. One that was hit meanwhile has fired. */
void slot_disarm(uint8_t n, uint8_t kind, uint8_t reason) {
  slot_t *slot = &slots[n];
  order_t *order = &orders[n];
  for (;;) {
    slots_take_hits();
    if (!order->armed) return;
    slot_t *before = 0, *at = slot_heads[order->rising];
    while (at != END && at != slot) {
      before = at;
      at = at->next;
    }
    hal_irq_off();
    if (slots_hit_waiting()) {
      hal_irq_on();
      continue;
    }
    if (before) before->next = slot->next;
    else set_head(order->rising, slot->next);
    hal_irq_on();
    order->armed = 0;
    voice_outcome_now(order->id, kind, reason, order->output);
    return;
  }
}

/* Ends armed slots that are not in `keep` and whose output is in `outputs`. */
void slots_end(uint32_t keep, uint16_t outputs, uint8_t reason) {
  for (uint8_t n = 0; n < N_SLOTS; n++, keep >>= 1) {
    if (!orders[n].armed || (keep & 1) || !(outputs & 1u << orders[n].output)) continue;
    slot_disarm(n, DISARMED, reason);
  }
}

/* Slots left behind. A count that moves by one leaves none; this is for a count that was upset. */
void slots_sweep(void) {
  hal_irq_off();
  int32_t count = hal_count();
  hal_irq_on();
  for (uint8_t n = 0; n < N_SLOTS; n++) {
    if (orders[n].armed && ahead(n, count) <= 0) slot_disarm(n, PASSED, R_NONE);
  }
}

bool slots_share_low_byte(int32_t target) {
  for (uint8_t n = 0; n < N_SLOTS; n++) {
    if (orders[n].armed && (uint8_t)slots[n].target == (uint8_t)target) return true;
  }
  return false;
}

/* Bit n: a slot is armed to raise output n. */
mask_t slots_armed_outputs(void) {
  mask_t mask = 0;
  if (slot_heads[0] == END && slot_heads[1] == END) return 0;
  for (const order_t *order = orders; order < orders + N_SLOTS; order++) {
    if (order->armed) mask |= BIT(order->output);
  }
  return mask;
}

/* Which slots on this output the interrupt may fire by itself, as limits are now. */
void slots_refresh_fast(uint8_t output) {
  for (uint8_t n = 0; n < N_SLOTS; n++) {
    if (!orders[n].armed || orders[n].output != output) continue;
    slots[n].fast = output_slot_fast(slots[n].target, &orders[n]) ? BIT(output) : 0;
  }
}

bool slots_have(uint32_t id) {
  for (const order_t *order = orders; order < orders + N_SLOTS; order++) {
    if (order->armed && order->id == id) return true;
  }
  return false;
}
