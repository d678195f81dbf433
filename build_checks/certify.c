/*
 * Measures the elementary functions against this machine's mathematics in the next wider type, argument by argument.
 *
 * Compiled behind the functions themselves, whose prefix is `own`, with OWN_DIGITS the digits of own_real and `wide` a
 * type with enough digits more that its own error does not count.
 */
#include <math.h>
#include <stddef.h>

#define TINY ((own_real)1 / ((uint64_t)1 << (OWN_DIGITS / 2 + 1)))
#define SMALL ((wide)1 / ((wide)1024 * 1024))

typedef struct worst {
    double error;      /* ulp */
    double inputs[2];
} worst;

/* The distance of neighbouring numbers of the type at the size of a true result. */
static wide spacing(wide result)
{
    own_bits bits;
    const own_real size = (own_real)WIDE(fabs)(result);

    bits.real = size;
    bits.word += 1u;
    if ((wide)size > WIDE(fabs)(result)) {  /* rounded up, perhaps to where numbers stand wider apart */
        bits.word -= 2u;
        return (wide)size - (wide)bits.real;
    }
    return (wide)bits.real - (wide)size;
}

static void take(worst *most, wide error, own_real first, own_real second)
{
    const double size = (double)WIDE(fabs)(error);

    if (!(size <= most->error)) {  /* a NaN counts as worst */
        most->error = size;
        most->inputs[0] = (double)first;
        most->inputs[1] = (double)second;
    }
}

static own_real number(uint64_t word)
{
    own_bits bits;

    bits.word = (OWN_WORD)word;
    return bits.real;
}

/* Below 2^-10 three terms of the series are good to 2^-70 of the result, and far quicker. */
static wide true_sine(wide angle)
{
    const wide square = angle * angle;

    return (square < SMALL) ? angle - angle * square * (1 - square / 20) / 6 : WIDE(sin)(angle);
}

static wide true_cosine(wide angle)
{
    const wide square = angle * angle;

    return (square < SMALL) ? 1 - square * (1 - square * (1 - square / 30) / 12) / 2 : WIDE(cos)(angle);
}

static wide true_atan2(wide y, wide x)
{
    const wide square = y * y;

    return ((square < SMALL) && (x == 1) && (y >= 0)) ? y - y * square * (1 - square * 3 / 5) / 3 : WIDE(atan2)(y, x);
}

/* Sine and cosine, in ulp of each result, of the numbers with words first, first + stride, ... up to last. */
void scan_near(uint64_t first, uint64_t last, uint64_t stride, worst *sine, worst *cosine)
{
    for (uint64_t word = first; word <= last; word += stride) {
        const own_real angle = number(word);
        own_real s;
        own_real c;

        own_sin_cos(angle, &s, &c);
        if ((angle < TINY) && (s == angle) && (c == 1)) {
            continue;  /* within angle^2 / 6 of the result, less than a tenth of an ulp */
        }
        const wide sine_of_angle = true_sine((wide)angle);
        const wide cosine_of_angle = true_cosine((wide)angle);
        take(sine, ((wide)s - sine_of_angle) / spacing(sine_of_angle), angle, 0);
        take(cosine, ((wide)c - cosine_of_angle) / spacing(cosine_of_angle), angle, 0);
    }
}

/* Both functions of angles of any size, in ulp of results just below 1. */
void scan_far(uint64_t first, uint64_t last, uint64_t stride, worst *both)
{
    const wide unit = WIDE(ldexp)((wide)1, -OWN_DIGITS);

    for (uint64_t word = first; word <= last; word += stride) {
        const own_real angle = number(word);
        own_real s;
        own_real c;

        own_sin_cos(angle, &s, &c);
        take(both, ((wide)s - WIDE(sin)((wide)angle)) / unit, angle, 0);
        take(both, ((wide)c - WIDE(cos)((wide)angle)) / unit, angle, 0);
    }
}

static void take_atan2(worst *most, own_real y, own_real x)
{
    const wide angle = true_atan2((wide)y, (wide)x);

    take(most, ((wide)own_atan2(y, x) - angle) / spacing(angle), y, x);
}

/* The arc tangent of the ratios with words first, first + stride, ... up to last. */
void scan_arc(uint64_t first, uint64_t last, uint64_t stride, worst *most)
{
    for (uint64_t word = first; word <= last; word += stride) {
        const own_real ratio = number(word);

        if ((ratio >= TINY) || (own_atan2(ratio, 1) != ratio)) {  /* else within ratio^2 / 3 of the result */
            take_atan2(most, ratio, 1);
        }
    }
}

/* Pairs of every octant: the larger from 1 to 2, the smaller in proportion, both with digits at random. */
void scan_pairs(uint64_t seed, uint64_t count, worst *most)
{
    const wide step = WIDE(ldexp)((wide)1, -53);
    uint64_t state = seed;

    for (uint64_t turn = 0; turn < count; ++turn) {
        own_real pair[2];

        for (int i = 0; i < 2; ++i) {  /* G. Marsaglia, Xorshift RNGs, J. Stat. Softw. 8(14) 2003 */
            state ^= state << 13;
            state ^= state >> 7;
            state ^= state << 17;
            pair[i] = (own_real)((wide)(state >> 11) * step);
        }
        pair[0] += 1;
        pair[1] *= pair[0];
        take_atan2(most, ((turn & 1u) != 0u) ? pair[0] : pair[1],
                   (((turn & 2u) != 0u) ? -1 : 1) * (((turn & 1u) != 0u) ? pair[1] : pair[0]));
    }
}

/* How many square roots differ from the correctly rounded one, which IEC 60559 asks of the library's. */
uint64_t scan_roots(uint64_t first, uint64_t last, uint64_t stride)
{
    uint64_t wrong = 0;

    for (uint64_t word = first; word <= last; word += stride) {
        const own_real x = number(word);
        wrong += (own_sqrt(x) - OWN_LIBM(sqrt)(x) != 0);
    }
    return wrong;
}

#if defined(OWN_SOFTWARE_FLOAT)
/* How many quotients and conversions made without a float unit differ from this machine's, whose bits they must have. */
uint64_t scan_software(uint64_t seed, uint64_t count)
{
    uint64_t state = seed;
    uint64_t wrong = 0;

    for (uint64_t turn = 0; turn < count; ++turn) {
        own_bits small;
        own_bits large;
        int32_t whole;

        state = state * 6364136223846793005u + 1442695040888963407u;  /* D. E. Knuth, MMIX, as in TAOCP 2, 3.3.4 */
        small.word = 0x3F800000u | ((uint32_t)(state >> 41) & 0x007FFFFFu);
        large.word = 0x40000000u | ((uint32_t)(state >> 18) & 0x007FFFFFu);
        if ((turn & 1u) != 0u) {  /* neighbours: quotients next to 1 */
            large.word = small.word + ((uint32_t)(state >> 60));
        }
        wrong += (own_ratio(small, large) != small.real / large.real);
        whole = (int32_t)(uint32_t)(state >> 32) >> (turn % 31u);
        wrong += (own_real_of(whole, 127u) != (own_real)whole / 1073741824.0f);
    }
    return wrong;
}
#endif
