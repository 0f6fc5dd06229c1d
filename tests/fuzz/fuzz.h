/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_FUZZ_H
#define AW_TESTS_FUZZ_H

#include <glib.h>
#include <stddef.h>
#include <stdint.h>

/**
 * Fuzz harnesses. Each tests/fuzz/fuzz_NAME.c defines one function fuzz_NAME that feeds arbitrary bytes to a reader
 * and must never crash, hang or claim memory beyond reason; its seeds and every input that once broke it are in
 * tests/fuzz/corpus/NAME. `make fuzz-build` makes build/fuzz/NAME with libFuzzer; tests/unit/test_fuzz_replay.c runs
 * all seeds through the same functions in the unit tests. A new harness is its file, its corpus and one line in
 * FUZZ_HARNESSES.
 */
#define FUZZ_HARNESSES FUZZ_HARNESS(csv) FUZZ_HARNESS(image) FUZZ_HARNESS(layout) FUZZ_HARNESS(record)

#define FUZZ_HARNESS(name) void fuzz_##name(const uint8_t *bytes, size_t n);
FUZZ_HARNESSES
#undef FUZZ_HARNESS

/* In the harness file: makes it libFuzzer's entry when it is compiled for that. */
#ifdef AW_FUZZER
#define FUZZ_ENTRY(name)                                                                                               \
  int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t n);                                                          \
  int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t n)                                                           \
  {                                                                                                                    \
    fuzz_##name(bytes, n);                                                                                             \
    return 0;                                                                                                          \
  }
#else
#define FUZZ_ENTRY(name)
#endif

#endif
