/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_BASE_RANDOM_H
#define AW_BASE_RANDOM_H

#include <glib.h>

/**
 * AwRandom: a small seeded random stream.
 *
 * Results must not depend on the number of threads, so each work item draws from its own stream, made from
 * (seed, item). Generator: splitmix64 (Steele, Lea & Flood, "Fast splittable pseudorandom number generators",
 * OOPSLA 2014).
 */
typedef struct {
  guint64 state;
} AwRandom;

/* The stream of work item `item` under `seed`. */
AwRandom aw_random_stream(guint64 seed, guint64 item);

/* 64 uniform random bits. */
static inline guint64 aw_random_bits(AwRandom *r)
{
  guint64 z = (r->state += G_GUINT64_CONSTANT(0x9e3779b97f4a7c15));
  z = (z ^ (z >> 30)) * G_GUINT64_CONSTANT(0xbf58476d1ce4e5b9);
  z = (z ^ (z >> 27)) * G_GUINT64_CONSTANT(0x94d049bb133111eb);
  return z ^ (z >> 31);
}

/* Uniform in [0, 1), 53 bits. */
static inline double aw_random_unit(AwRandom *r)
{
  return (double)(aw_random_bits(r) >> 11) * 0x1.0p-53;
}

/* Uniform integer in 0 ... n-1 for 1 <= n < 2^32 (bias below 2^-32). */
static inline guint32 aw_random_below(AwRandom *r, guint32 n)
{
  return (guint32)(((aw_random_bits(r) >> 32) * n) >> 32);
}

/* Standard normal deviate (Box & Muller 1958, one of the pair). */
double aw_random_normal(AwRandom *r);

/* Poisson deviate of the given mean >= 0. */
unsigned aw_random_poisson(AwRandom *r, double mean);

#endif
