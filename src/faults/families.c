/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/fault.h"

#include <string.h>

const struct fault_family *const fault_families[] = {
    &fault_family_none,
    &fault_family_break,
    &fault_family_joint,
    &fault_family_contact,
    &fault_family_switched_off,
    &fault_family_load,
    &fault_family_interconnection,
    &fault_family_spur,
    &fault_family_reversal,
    &fault_family_transposed,
    &fault_family_short,
    &fault_family_parallel,
    &fault_family_size,
    &fault_family_wrong_leg,
    &fault_family_not_crossed,
    &fault_family_bad_link,
    &fault_family_not_nulled,
};

const size_t n_fault_families = sizeof fault_families / sizeof fault_families[0];

const struct fault_family *fault_family_find(const char *name)
{
    for (size_t i = 0; i < n_fault_families; i++)
        if (strcmp(fault_families[i]->name, name) == 0)
            return fault_families[i];
    return NULL;
}
