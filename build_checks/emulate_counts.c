/*
 * Counts, for the emulator's block hook, how often each basic block of a program ran and how often it was left by a jump.
 *
 * A block is known by its first address; `base` is the lowest address of the program and two bytes its smallest step.
 */
#include <stdint.h>

typedef struct block_counts {
    uint64_t base;      /* lowest address of the program */
    uint64_t slots;     /* length of the arrays below */
    uint64_t *runs;     /* by start address: times executed */
    uint64_t *jumps;    /* by start address: times the next block was not the one that follows it in memory */
    uint32_t *bytes;    /* by start address: length of the block */
    uint64_t previous;  /* slot of the block that ran last; `slots` at the start of a call */
    uint64_t next;      /* the address that follows the block that ran last */
} block_counts;

/* The emulator's hook for a block that starts. */
void count_block(void *emulator, uint64_t address, uint32_t size, void *user)
{
    block_counts *const counts = user;
    const uint64_t slot = (address - counts->base) / 2u;

    (void)emulator;
    if ((counts->previous < counts->slots) && (address != counts->next)) {
        counts->jumps[counts->previous]++;
    }
    if (slot < counts->slots) {
        counts->runs[slot]++;
        counts->bytes[slot] = size;
    }
    counts->previous = slot;
    counts->next = address + size;
}
