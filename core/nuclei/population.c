/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/population.h"

#include "base/error.h"
#include "base/random.h"
#include "base/text.h"

#define CELL_UM 40.0  /* of the search grid: more than the longest nucleus and a gap */
#define MAX_TRIES 400 /* places tried for one nucleus */
#define FAR_GAP_UM 30.0
#define CROWD_UM 0.3 /* nuclei of a clump keep this much from those they were not laid against */
#define N_PATCH_WAVES 6
#define POORLY_STAINED_FRAC 0.05

typedef struct {
  const AwPopulationPlan *plan;
  GPtrArray *truths;
  int n_x, n_y;
  GArray **cell; /* indices of the truths whose centroid lies in the cell */
  double wave_x[N_PATCH_WAVES], wave_y[N_PATCH_WAVES], phase[N_PATCH_WAVES];
} Ground;

static double between(AwRandom *r, double low, double high)
{
  return low + (high - low) * aw_random_unit(r);
}

/* A normal deviate that never strays beyond 2. */
static double tame_normal(AwRandom *r)
{
  return CLAMP(aw_random_normal(r), -2.0, 2.0);
}

static Ground *ground_new(const AwPopulationPlan *plan)
{
  Ground *ground = g_new0(Ground, 1);
  ground->plan = plan;
  ground->truths = aw_truths_new();
  ground->n_x = (int)((plan->to.x_um - plan->from.x_um) / CELL_UM) + 1;
  ground->n_y = (int)((plan->to.y_um - plan->from.y_um) / CELL_UM) + 1;
  ground->cell = g_new0(GArray *, (gsize)ground->n_x * (gsize)ground->n_y);
  AwRandom r = aw_random_stream(plan->seed, 0);
  for (int k = 0; k < N_PATCH_WAVES; k++) {
    double turn = 2.0 * G_PI * aw_random_unit(&r), per_um = 2.0 * G_PI / between(&r, 350.0, 900.0);
    ground->wave_x[k] = per_um * cos(turn);
    ground->wave_y[k] = per_um * sin(turn);
    ground->phase[k] = 2.0 * G_PI * aw_random_unit(&r);
  }
  return ground;
}

static void ground_free(Ground *ground)
{
  for (int i = 0; i < ground->n_x * ground->n_y; i++)
    if (ground->cell[i])
      g_array_unref(ground->cell[i]);
  g_free(ground->cell);
  if (ground->truths)
    g_ptr_array_unref(ground->truths);
  g_free(ground);
}
G_DEFINE_AUTOPTR_CLEANUP_FUNC(Ground, ground_free)

static int cell_x(const Ground *ground, AwScanPoint q)
{
  return CLAMP((int)((q.x_um - ground->plan->from.x_um) / CELL_UM), 0, ground->n_x - 1);
}

static int cell_y(const Ground *ground, AwScanPoint q)
{
  return CLAMP((int)((q.y_um - ground->plan->from.y_um) / CELL_UM), 0, ground->n_y - 1);
}

static void lay(Ground *ground, AwTruth *truth)
{
  guint index = ground->truths->len;
  GArray **cell = ground->cell + (cell_y(ground, truth->centroid) * ground->n_x + cell_x(ground, truth->centroid));
  if (!*cell)
    *cell = g_array_new(FALSE, FALSE, sizeof index);
  g_array_append_val(*cell, index);
  g_ptr_array_add(ground->truths, truth);
}

/* Whether the truth keeps gap_um from all that lies there, the one it leans on left out. */
static gboolean fits(const Ground *ground, const AwTruth *truth, double gap_um, const AwTruth *partner)
{
  int cx = cell_x(ground, truth->centroid), cy = cell_y(ground, truth->centroid);
  for (int y = MAX(cy - 1, 0); y <= MIN(cy + 1, ground->n_y - 1); y++)
    for (int x = MAX(cx - 1, 0); x <= MIN(cx + 1, ground->n_x - 1); x++) {
      const GArray *cell = ground->cell[y * ground->n_x + x];
      for (guint i = 0; cell && i < cell->len; i++) {
        const AwTruth *other = ground->truths->pdata[g_array_index(cell, guint, i)];
        if (other != partner && isfinite(aw_truth_gap(truth, other, gap_um)))
          return FALSE;
      }
    }
  return TRUE;
}

/* Cells settle in patches: slow waves over the dish decide where a place is taken. */
static gboolean is_bare(const Ground *ground, AwScanPoint q, AwRandom *r)
{
  double sum = 0.0;
  for (int k = 0; k < N_PATCH_WAVES; k++)
    sum += cos(ground->wave_x[k] * q.x_um + ground->wave_y[k] * q.y_um + ground->phase[k]);
  double crowd = 1.0 / (1.0 + exp(-2.5 * sum));
  return aw_random_unit(r) > 1.0 - ground->plan->patchy_frac * (1.0 - crowd);
}

static AwTruth *from_shape(AwTruthKind kind, const AwShape *shape, AwRandom *r)
{
  AwScanPoint outline[AW_SHAPE_N_POINTS];
  aw_shape_outline(shape, outline);
  AwTruth *truth = aw_truth_new(kind, outline, AW_SHAPE_N_POINTS);
  truth->seed = aw_random_bits(r);
  return truth;
}

static void draw_waves(AwShape *shape, double size, AwRandom *r)
{
  static const double fall[AW_SHAPE_N_WAVES] = { 1.0, 0.8, 0.45, 0.25, 0.15 };
  for (int k = 0; k < AW_SHAPE_N_WAVES; k++) {
    shape->wave_cos[k] = size * fall[k] * tame_normal(r);
    shape->wave_sin[k] = size * fall[k] * tame_normal(r);
  }
}

/* DNA content: 1 before, 2 after its doubling, in between meanwhile. */
static double draw_content(AwRandom *r)
{
  double u = aw_random_unit(r);
  return u < 0.55 ? 1.0 : u < 0.75 ? 1.0 + (u - 0.55) / 0.2 : 2.0;
}

/* Long, bent and with blunt ends; gives the aspect. */
static double make_kidney(AwShape *shape, AwRandom *r)
{
  shape->wave_cos[2] -= 0.045;
  shape->bend_rad = between(r, 0.7, 1.15);
  return between(r, 1.4, 1.7);
}

static AwTruth *interphase(const Ground *ground, AwScanPoint at, AwRandom *r)
{
  double content = draw_content(r), width = 13.4 * pow(content, 0.3) * exp(0.055 * tame_normal(r));
  double aspect = 1.08 + 0.6 * aw_random_unit(r) * aw_random_unit(r);
  AwShape shape = { .position = at, .angle_rad = G_PI * aw_random_unit(r) };
  draw_waves(&shape, 0.025, r);
  if (aw_random_unit(r) < 0.1)
    aspect = make_kidney(&shape, r);
  shape.major_um = width * sqrt(aspect);
  shape.minor_um = width / sqrt(aspect);
  AwTruth *truth = from_shape(AW_TRUTH_INTERPHASE, &shape, r);
  truth->light_e = ground->plan->light_e * content * exp(0.07 * tame_normal(r));
  if (aw_random_unit(r) < POORLY_STAINED_FRAC)
    truth->light_e *= between(r, 0.45, 0.65);
  truth->dome_frac = between(r, 0.25, 0.5);
  truth->texture_frac = between(r, 0.1, 0.2);
  return truth;
}

/* Condensed chromosomes: a ring seen from the pole, a plate seen from the side. */
static AwTruth *mitotic(const Ground *ground, AwScanPoint at, gboolean ring, double angle_rad, AwRandom *r)
{
  double length = between(r, 10.5, 13.0);
  AwShape shape = { .position = at, .major_um = length, .minor_um = length * between(r, 0.3, 0.4) };
  shape.angle_rad = angle_rad;
  if (ring)
    shape.minor_um = length * between(r, 0.8, 0.95);
  draw_waves(&shape, ring ? 0.03 : 0.02, r);
  AwTruth *truth = from_shape(AW_TRUTH_MITOTIC, &shape, r);
  truth->light_e = ground->plan->light_e * 2.0 * exp(0.07 * tame_normal(r));
  truth->dome_frac = ring ? -0.75 : 0.3;
  truth->texture_frac = ring ? 0.2 : 0.15;
  return truth;
}

/* The two halves of a late mitosis, side by side; FALSE when the second does not fit, and neither is kept. */
static gboolean lay_halves(Ground *ground, AwScanPoint at, AwRandom *r)
{
  double angle = G_PI * aw_random_unit(r), apart = between(r, 8.5, 12.0) / 2.0;
  AwScanPoint a = { at.x_um - apart * sin(angle), at.y_um + apart * cos(angle) };
  AwScanPoint b = { at.x_um + apart * sin(angle), at.y_um - apart * cos(angle) };
  g_autoptr(AwTruth) first = mitotic(ground, a, FALSE, angle, r);
  g_autoptr(AwTruth) second = mitotic(ground, b, FALSE, angle, r);
  if (!fits(ground, first, ground->plan->gap_um, NULL) || !fits(ground, second, ground->plan->gap_um, NULL))
    return FALSE;
  first->light_e /= 2.0;
  second->light_e /= 2.0;
  lay(ground, g_steal_pointer(&first));
  lay(ground, g_steal_pointer(&second));
  return TRUE;
}

static AwTruth *moved(const AwTruth *truth, double dx_um, double dy_um)
{
  AwTruth *copy = aw_truth_new(truth->kind, truth->outline, truth->n_outline);
  for (gsize i = 0; i < copy->n_outline; i++) {
    copy->outline[i].x_um += dx_um;
    copy->outline[i].y_um += dy_um;
  }
  AwTruth *result = aw_truth_new(copy->kind, copy->outline, copy->n_outline);
  aw_truth_free(copy);
  result->light_e = truth->light_e;
  result->dome_frac = truth->dome_frac;
  result->texture_frac = truth->texture_frac;
  result->seed = truth->seed;
  return result;
}

/* Slides the truth along a direction up to its partner: a step as long as the gap can never overshoot. */
static AwTruth *slid_against(AwTruth *truth, const AwTruth *partner, double angle_rad, double touch_um)
{
  double start = truth->reach_um + partner->reach_um, c = cos(angle_rad), s = sin(angle_rad);
  AwTruth *at = moved(truth, partner->centroid.x_um + start * c - truth->centroid.x_um,
                      partner->centroid.y_um + start * s - truth->centroid.y_um);
  for (int k = 0; k < 30; k++) {
    double gap = aw_truth_gap(at, partner, 100.0);
    double step = gap > 0.02 ? gap : -touch_um;
    AwTruth *next = moved(at, -step * c, -step * s);
    aw_truth_free(at);
    at = next;
    if (gap <= 0.02)
      break;
  }
  return at;
}

static gboolean lay_against(Ground *ground, AwRandom *r)
{
  const AwTruth *partner = ground->truths->pdata[aw_random_below(r, ground->truths->len)];
  if (partner->kind != AW_TRUTH_INTERPHASE)
    return FALSE;
  g_autoptr(AwTruth) far = interphase(ground, ground->plan->from, r);
  double angle = 2.0 * G_PI * aw_random_unit(r);
  g_autoptr(AwTruth) truth = slid_against(far, partner, angle, between(r, -0.5, 0.6));
  AwScanPoint q = truth->centroid, from = ground->plan->from, to = ground->plan->to;
  if (q.x_um < from.x_um || q.y_um < from.y_um || q.x_um > to.x_um || q.y_um > to.y_um ||
      !fits(ground, truth, CROWD_UM, partner))
    return FALSE;
  lay(ground, g_steal_pointer(&truth));
  return TRUE;
}

static AwScanPoint any_place(const Ground *ground, AwRandom *r)
{
  const AwPopulationPlan *plan = ground->plan;
  double x = between(r, plan->from.x_um, plan->to.x_um);
  return (AwScanPoint){ x, between(r, plan->from.y_um, plan->to.y_um) };
}

static gboolean lay_free(Ground *ground, gboolean is_mitotic, gboolean room_for_two, AwRandom *r)
{
  AwScanPoint at = any_place(ground, r);
  if (is_bare(ground, at, r))
    return FALSE;
  double form = aw_random_unit(r), angle = G_PI * aw_random_unit(r);
  if (is_mitotic && room_for_two && form < 0.25)
    return lay_halves(ground, at, r);
  g_autoptr(AwTruth) truth = is_mitotic ? mitotic(ground, at, form > 0.7, angle, r) : interphase(ground, at, r);
  if (!fits(ground, truth, ground->plan->gap_um, NULL))
    return FALSE;
  lay(ground, g_steal_pointer(&truth));
  return TRUE;
}

static gboolean lay_nuclei(Ground *ground, GError **error)
{
  const AwPopulationPlan *plan = ground->plan;
  while (ground->truths->len < (guint)plan->n_nuclei) {
    AwRandom r = aw_random_stream(plan->seed, ground->truths->len + 1);
    gboolean in_clump = ground->truths->len > 0 && aw_random_unit(&r) < plan->clump_frac;
    gboolean is_mitotic = !in_clump && aw_random_unit(&r) < plan->mitotic_frac / MAX(1.0 - plan->clump_frac, 1e-9);
    gboolean room_for_two = ground->truths->len + 2 <= (guint)plan->n_nuclei, done = FALSE;
    /* Where no clump has room, or no interphase nucleus to lean on lies there yet, it lies alone. */
    for (int i = 0; i < MAX_TRIES && in_clump && !done; i++)
      done = lay_against(ground, &r);
    for (int i = 0; i < MAX_TRIES && !done; i++)
      done = lay_free(ground, is_mitotic, room_for_two, &r);
    if (!done) {
      g_autofree char *width = aw_text_from_double(plan->to.x_um - plan->from.x_um, 0);
      g_autofree char *height = aw_text_from_double(plan->to.y_um - plan->from.y_um, 0);
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "only %u of %d nuclei found room in %s x %s um", ground->truths->len,
                  plan->n_nuclei, width, height);
      return FALSE;
    }
  }
  return TRUE;
}

/* A speck of dirt: small, of any brightness, often floating above the cells. */
static AwTruth *speck(const Ground *ground, AwScanPoint at, double width_um, AwRandom *r)
{
  AwShape shape = { .position = at, .major_um = width_um, .minor_um = width_um * between(r, 0.6, 1.0) };
  shape.angle_rad = G_PI * aw_random_unit(r);
  draw_waves(&shape, 0.05, r);
  AwTruth *truth = from_shape(AW_TRUTH_DEBRIS, &shape, r);
  double g1_area = 141.0; /* um2, so that a speck's brightness is counted in nuclei's */
  truth->light_e = ground->plan->light_e * truth->area_um2 / g1_area * exp(between(r, -0.5, 1.0));
  truth->dome_frac = 0.3;
  return truth;
}

/* A dead cell's nucleus falls into round bright pieces of unequal size. */
static void lay_fragments(Ground *ground, AwScanPoint at, AwRandom *r)
{
  int n = 4 + (int)aw_random_below(r, 4);
  for (int i = 0; i < n; i++) {
    double distance = 4.5 * sqrt(aw_random_unit(r)), turn = 2.0 * G_PI * aw_random_unit(r);
    AwScanPoint q = { at.x_um + distance * cos(turn), at.y_um + distance * sin(turn) };
    AwTruth *piece = speck(ground, q, between(r, 1.4, 3.6), r);
    piece->light_e *= 2.2;
    g_ptr_array_add(ground->truths, piece);
  }
}

static void lay_debris(Ground *ground)
{
  int n = (int)floor(ground->plan->debris_per_nucleus * ground->plan->n_nuclei + 0.5);
  for (int i = 0; i < n; i++) {
    AwRandom r = aw_random_stream(ground->plan->seed, (G_GUINT64_CONSTANT(1) << 40) + (guint64)i);
    AwScanPoint at = any_place(ground, &r);
    if (aw_random_unit(&r) < 0.15) {
      lay_fragments(ground, at, &r);
      continue;
    }
    AwTruth *dirt = speck(ground, at, 1.0 + 2.6 * aw_random_unit(&r) * aw_random_unit(&r), &r);
    dirt->blur_um = aw_random_unit(&r) < 0.35 ? between(&r, 1.0, 4.0) : 0.0;
    g_ptr_array_add(ground->truths, dirt);
  }
}

GPtrArray *aw_population_new(const AwPopulationPlan *plan, GError **error)
{
  g_return_val_if_fail(plan->n_nuclei >= 0 && plan->from.x_um < plan->to.x_um && plan->from.y_um < plan->to.y_um, NULL);
  g_autoptr(Ground) ground = ground_new(plan);
  if (!lay_nuclei(ground, error))
    return NULL;
  lay_debris(ground);
  aw_truths_measure_gaps(ground->truths, FAR_GAP_UM);
  return g_steal_pointer(&ground->truths);
}
