/*
 * The controller core: everything a board must enforce, written once. See PROTOCOL.md.
 *
 * Freestanding C99: no heap, no floating point, no recursion, every loop bounded, no global state.
 * Ticks are the board's own 32-bit clock and wrap; they are compared by signed distance.
 *
 * A main loop is, in this order: core_inputs, core_reading whenever an averaged set of readings is
 * complete, core_pass. core_byte, core_break and core_conversion may be called from interrupts.
 */
#ifndef BEAMSITTER_CORE_H
#define BEAMSITTER_CORE_H

#include "board.h"

#define CORE_PROTOCOL 1u
#define CORE_LINE_MAX 160u  /* bytes before the line end */
#define CORE_ANCHORS 64u    /* samples a permit may name; a power of two */
#define CORE_POINTS_MAX 32u /* of the curve */
#define CORE_POINTS_MIN 2u
#define CORE_MEDIAN 5u
#define CORE_PEAK_SLOTS 5u
#define CORE_ARGS_MAX 7u

/** States. Emitting is armed with a drive above zero. */
enum core_state { CORE_STANDBY = 0, CORE_ARMED, CORE_TRIPPED };

/** Cause codes a board can give; PROTOCOL.md has the table. Never reused. */
enum core_cause {
  CORE_CAUSE_PERSON = 0,
  CORE_CAUSE_ARMED_IDLE = 1,
  CORE_CAUSE_PERMIT_EXPIRED = 2,
  CORE_CAUSE_SECOND_INTRODUCTION = 3,
  CORE_CAUSE_BARE_DARK = 4,
  CORE_CAUSE_POWER_LOST = 5,
  CORE_CAUSE_WATCHDOG = 6,
  CORE_CAUSE_BROWN_OUT = 7,
  CORE_CAUSE_OVER_CEILING = 8,
  CORE_CAUSE_OVER_AIM = 9,
  CORE_CAUSE_DARK_CURRENT = 10,
  CORE_CAUSE_CASE_OVER = 11,
  CORE_CAUSE_CASE_OPEN = 12,
  CORE_CAUSE_CASE_SHORT = 13,
  CORE_CAUSE_SUPPLY_LOW = 14,
  CORE_CAUSE_SUPPLY_HIGH = 15,
  CORE_CAUSE_KEY_OFF = 16,
  CORE_CAUSE_LOOP_OPEN = 17,
  CORE_CAUSE_CONVERTER_STOPPED = 18,
  CORE_CAUSE_MEMORY = 19,
  CORE_CAUSE_CURVE_DAMAGED = 20,
  CORE_CAUSE_DEFECT = 21,
  CORE_CAUSE_UNKNOWN = 255
};

/** How long something has held: on, and since which tick. */
struct core_since {
  uint32_t tick;
  uint8_t on;
};

/** The highest value of the last so many milliseconds, in slots of a quarter of that. */
struct core_peak {
  uint16_t slot[CORE_PEAK_SLOTS];
  uint32_t tick; /* when the newest slot began */
  uint8_t newest;
};

struct core_point {
  uint16_t x; /* counts of case */
  uint16_t y; /* counts of set */
};

struct core_curve {
  struct core_point point[CORE_POINTS_MAX];
  uint8_t count; /* 0: none */
};

/** The live permit; live 0 means erased. */
struct core_permit {
  uint32_t n;      /* the judged sample */
  uint32_t n_tick; /* its tick: the term counts from here */
  uint16_t cap;
  uint16_t aim;
  uint16_t term;
  uint16_t age; /* on arrival, capped: the true loop delay */
  uint8_t live;
  uint8_t seen; /* one was accepted in this session: n is its number */
};

/** The one-time number of an offer. */
struct core_offer {
  uint32_t number;
  uint32_t tick;
  uint8_t kind; /* 0 none open, else CORE_OFFER_ARM or CORE_OFFER_INJECT */
};

/** Lines by what became of them, since boot. */
struct core_counts {
  uint32_t good;
  uint32_t crc; /* with char and direction: damaged on the wire or not for us */
  uint32_t too_long;
  uint32_t form;
  uint32_t verb;
  uint32_t refused;
  uint32_t bare;
  uint32_t writes;
};

/** What interrupts and main loop share: single bytes, or pairs behind an index. */
struct core_wire {
  volatile uint8_t ring[256]; /* received bytes; the indexes wrap by themselves */
  volatile uint8_t head;      /* next byte to write, by the interrupt */
  volatile uint8_t tail;      /* next byte to read, by the main loop */
  volatile uint8_t cancels;   /* bytes 0x18 in a row */
  volatile uint8_t dark;      /* an unchecked dark was seen */
  volatile uint8_t cause;     /* a protection cut the output; its cause, 0 for none */
  volatile uint8_t lit;       /* a session is open: protections act */
  volatile uint8_t over;      /* conversions over the ceiling in a row */
  volatile uint8_t inject_over;
  volatile uint8_t limit_index;
  volatile uint16_t limit[2]; /* counts of current no conversion may pass */
  volatile uint16_t conversions;
};

struct core {
  const CORE_FLASH struct core_board *board;
  const struct core_port *port;
  struct core_wire wire;
  uint8_t line[CORE_LINE_MAX + 4u]; /* a line being read, then the answer being written */
  uint8_t line_length;
  uint8_t scanned; /* bytes of the ring already searched for a line end */
  uint8_t skipping;
  struct core_since waiting; /* a line waits for room to answer it */

  uint32_t tick; /* of this pass */
  uint8_t started;

  uint8_t state;
  uint8_t cause; /* of the latch while tripped, else of the last dark */
  uint32_t session;
  struct core_permit permit;
  struct core_offer offer;
  uint32_t arms;
  uint16_t offers;
  uint8_t wrong;
  struct core_since asking;    /* on: an ask arm waits for the boot counter to be written */
  struct core_since backoff;   /* on: arming is refused for 30 s */
  struct core_since opened;    /* on: armed, no permit yet */
  struct core_since idle;      /* on: armed, no aim above zero */
  struct core_since delay;     /* on: the emission delay runs */
  struct core_since zero;      /* on: armed at zero drive */
  uint8_t was_lit;             /* current flowed in this session */

  uint16_t drive; /* counts of set, as commanded */
  uint16_t ceiling;
  uint32_t slew_rest; /* counts times microseconds not yet spent */
  uint32_t slew_tick;
  struct core_peak ceilings;
  struct core_peak drives;
  uint8_t indicator;
  uint8_t limited;

  /* Readings judged. */
  int32_t case_counts; /* newest plausible */
  int32_t median[CORE_MEDIAN];
  uint8_t median_count;
  uint8_t median_next;
  uint8_t case_ok; /* a plausible reading came last, under the limit */
  uint8_t case_over;
  uint8_t flowing; /* measured current above the dark limit */
  uint8_t open_readings;
  uint8_t short_readings;
  struct core_since case_open;
  struct core_since case_short;
  struct core_since supply_low;
  struct core_since supply_high;
  struct core_since follow;
  struct core_since dark_current;
  struct core_since over;
  struct core_since converter;
  uint16_t converter_last;

  /* Inputs. */
  volatile uint8_t key_raw;
  volatile uint8_t loop_raw;
  volatile uint8_t key_opened;
  volatile uint8_t loop_opened;
  volatile uint8_t hand_moved;
  uint8_t fan;
  uint8_t key;
  uint8_t loop;
  struct core_since key_closing;
  struct core_since loop_closing;
  struct core_since hand;

  /* Samples and anchors. */
  uint32_t seq;
  uint32_t anchor_seq;                /* of the newest anchor */
  uint32_t anchor_newest_tick;        /* its tick, whole */
  uint16_t anchor_tick[CORE_ANCHORS]; /* low half: the ring never spans more than the longest term */
  uint8_t anchor_newest;
  uint8_t anchor_count;
  uint8_t anchor_wait; /* samples until the next anchor */
  uint8_t group;

  /* Curves: one committed, one staged. */
  struct core_curve curve[2];
  uint32_t curve_crc;
  uint32_t check_crc;
  uint8_t check_point;
  uint8_t committed; /* index of the committed one */
  uint8_t stage_count;

  /* Introduction under way: next line to send, 0 none. */
  uint8_t intro;
  uint32_t manifest_crc;

  /* Non-volatile memory. */
  uint32_t boot;
  uint8_t slot;       /* where the newest counter stands, 255 none */
  uint8_t advanced;   /* 1 while the next counter is being written, 2 when it stands */
  uint8_t memory;     /* 1: readable */
  uint8_t latch_dirty;
  uint8_t lit_mark;
  uint8_t nv_tries;

  uint8_t injection; /* row + 1, 0 none */
  struct core_since injecting;

  struct core_counts counts;
  uint32_t uptime_s;
  uint32_t uptime_tick;
};

/**
 * Starts the core: dark, with latch, lit mark and boot counter read from non-volatile memory, and
 * sends the boot line. `reset_kind` is one of enum core_reset. `board` and `port` must outlive it.
 */
void core_init(struct core *c, const CORE_FLASH struct core_board *board,
               const struct core_port *port, uint8_t reset_kind);

/** One received byte. Interrupt: keeps it, and cuts at once on the third 0x18 in a row. */
void core_byte(struct core *c, uint8_t byte);

/** A serial break was seen. Interrupt: cuts at once. */
void core_break(struct core *c);

/** One unaveraged conversion of current, counts. Interrupt: cuts on the second over the ceiling. */
void core_conversion(struct core *c, uint16_t current_counts, uint32_t tick);

/**
 * An averaged set of readings is complete: judges it and sends a sample. Main loop.
 * `values` holds one count per channel, by index; the one of `set` is replaced by the drive.
 * `tick` is that of the end of the conversion.
 */
void core_reading(struct core *c, const int32_t *values, uint32_t tick);

/** Inputs as read now, 1 for on, closed, turning, moved. Main loop or interrupt; cuts on opening. */
void core_inputs(struct core *c, uint8_t key_on, uint8_t loop_closed, uint8_t fan_ok, uint8_t hand);

/**
 * One whole pass of the main loop: one line, expiry, slew, drive, and last of all port->alive.
 * `tick` is never earlier than one given before. Expiry is found here: pass often (1 ms is usual).
 */
void core_pass(struct core *c, uint32_t tick);

/** 1 while a whole received line waits for another pass. */
uint8_t core_line_waits(const struct core *c);

#endif
