/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef BASE_VECTORS_H
#define BASE_VECTORS_H

/*
 * For functions whose loops the compiler makes vectors of: one copy of the function for processors
 * with 256-bit vectors (AVX2), one for all others, chosen when the program is loaded. Sums are not
 * reordered and multiplications not fused with additions, so both give the same bits. Not with Clang,
 * whose release 14 gives the copies names that other files do not find, nor under the address
 * sanitizer, where it was not tried.
 */
#if defined(__x86_64__) && defined(__gnu_linux__) && defined(__GNUC__) && !defined(__clang__) &&   \
    !defined(__SANITIZE_ADDRESS__)
#define WIDE_VECTORS __attribute__((target_clones("avx2", "default")))
#else
#define WIDE_VECTORS
#endif

/* Four neighbours in an array of doubles, at any address of a double, as one value (an extension that
 * GCC and Clang share); for what the compiler does not find by itself. */
typedef double four_doubles
    __attribute__((vector_size(4 * sizeof(double)), aligned(sizeof(double)), may_alias));

#endif
