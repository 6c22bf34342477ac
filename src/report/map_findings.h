/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_MAP_FINDINGS_H
#define REPORT_MAP_FINDINGS_H

/* What the ring map shows of the findings: a band along wherever each may lie, the conductors apart
 * where one concerns one of them, bridges where it joins two places. Families are known by the
 * fields their faults carry, never by which one it is. */

#include "report/ring_layout.h"
#include "report/ring_map.h"

/* A map being drawn. */
struct map {
    const struct rf_diagnosis *diagnosis;
    const struct ring_layout *layout;
    struct scene *scene;
    bool *parted; /* [run] its conductors are drawn apart */
};

/* A line along the ring, `aside` px off it. */
void line_along(struct map *map, enum scene_role role, double from, double to, double aside);
struct position middle_of_run(const struct map *map, size_t run);

void part_conductors(struct map *map); /* fills `parted` */
void draw_findings(struct map *map);   /* bands, parted conductors, bridges */
void draw_inside(struct map *map);     /* letters and the runs' chances, inside the ring */

#endif
