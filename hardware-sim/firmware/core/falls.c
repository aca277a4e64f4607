/*
 * The falls ahead, in the order in which they come. The timer's interrupt (avr/service.S) makes the
 * first, takes it out of the list and sets itself up for the next, so that the time of a fall does
 * not depend on what the board is doing, nor on how many there are. What it has made waits here, with
 * its time, until the service books it.
 *
 * Called by whoever holds the bank. Only the interrupt takes from the front meanwhile: a place that
 * was found with interrupts on is good if the front has stayed what it was.
 */
#include "board.h"

/* Outputs that end within so much of each other end together, with the last: never early. */
#define TOGETHER_TICKS 8

fall_t falls[N_OUTPUTS + 1] __attribute__((used));
fall_t *volatile falls_head __attribute__((used));
mask_t falls_known;
#define END (&falls[N_OUTPUTS]) /* its mask is 0, and no other's in the list is */

void falls_begin(void) {
  END->next = END;
  falls_head = END;
}

static int16_t after(uint16_t a, uint16_t b) { return (int16_t)(uint16_t)(a - b); }

/* May an output that falls at `ticks` fall with these? */
static bool joins(const fall_t *fall, uint16_t ticks) {
  int16_t later = after(ticks, fall->ticks);
  if (later < 0) return -later <= TOGETHER_TICKS;
  if (later + fall->spread > TOGETHER_TICKS) return false;
  return fall->next->mask == 0 || after(fall->next->ticks, ticks) >= 0;
}

static void join(fall_t *fall, uint8_t n, uint16_t ticks) {
  int16_t later = after(ticks, fall->ticks);
  fall->mask |= BIT(n);
  if (later >= 0) {
    fall->ticks = ticks;
    fall->spread += (uint8_t)later;
  } else if (-later > fall->spread) {
    fall->spread = (uint8_t)-later;
  }
}

/* Makes output `n` idle at `ticks`, at most 16 ms from now; at once if that is past. */
void falls_add(uint8_t n, uint16_t ticks) {
  fall_t *own = falls, *head, *before, *at;
  while (own->mask) own++; /* one is free: there are as many as outputs */
  own->ticks = ticks;
  own->spread = 0;
  own->made = 0;
  falls_known |= BIT(n);
  bool done = false;
  do {
    head = falls_head;
    before = 0;
    for (at = head; at->mask && after(at->ticks, ticks) <= 0 && !joins(at, ticks); at = at->next) {
      before = at;
    }
    bool with = at->mask && joins(at, ticks);
    own->next = at;
    hal_irq_off();
    if (falls_head == head) {
      done = true;
      if (with) {
        join(at, n, ticks);
      } else {
        own->mask = BIT(n);
        if (before) before->next = own;
        else falls_head = own;
      }
      if (!before) hal_schedule(falls_head->ticks);
    }
    hal_irq_on();
  } while (!done);
}

/* Output `n` is not made idle, if it has not been yet. */
void falls_cancel(uint8_t n) {
  if (!(falls_known & BIT(n))) return;
  falls_known &= (mask_t)~BIT(n);
  fall_t *own = falls, *head, *before;
  while (!(own->mask & BIT(n))) own++;
  bool done = false;
  do {
    head = falls_head;
    before = 0;
    for (fall_t *at = head; at != own && at->mask; at = at->next) before = at;
    hal_irq_off();
    if (own->made || falls_head == head) {
      done = true;
      own->mask &= (mask_t)~BIT(n);
      if (own->mask == 0 && !own->made) {
        if (before) before->next = own->next;
        else falls_head = own->next;
      }
    }
    hal_irq_on();
  } while (!done);
}

/* Takes back what the timer has made. @returns which outputs, and when; 0: nothing more */
mask_t falls_take(uint16_t *ticks) {
  if (!falls_known) return 0;
  for (fall_t *fall = falls; fall < END; fall++) {
    if (!fall->made) continue;
    mask_t mask = fall->mask;
    *ticks = fall->ticks;
    fall->made = 0;
    fall->mask = 0;
    falls_known &= (mask_t)~mask;
    if (mask) return mask;
  }
  return 0;
}

/* With interrupts off: the service is to come at `ticks`, or at the next fall if that is sooner. */
void falls_wake(uint16_t ticks) {
  fall_t *head = falls_head;
  hal_schedule(head->mask && after(head->ticks, ticks) < 0 ? head->ticks : ticks);
}
