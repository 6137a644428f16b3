#include "proof/aim.h"

#include <math.h>

#define PI 3.14159265358979323846264338327950

/* The frequency that is read, cycles per sample. */
static double read_at(const lbr_aim *aim) {
  const lbr_proof *proof = aim->proof;
  const lbr_claim *claim = &proof->claims[aim->line];
  if (!(claim->f_hi > claim->f_lo)) return claim->f_lo / proof->rate;
  double hz = aim->p->actual[aim->line].hz / (1 + aim->p->timebase) +
              aim->read_bins * proof->rate / (double)proof->n;
  return fmin(fmax(hz, claim->f_lo), claim->f_hi) / proof->rate;
}

/* The response at a source and at its image, seen from the frequency read. */
static void look(const lbr_aim *aim, size_t source, double complex *direct,
                 double complex *image) {
  const lbr_proof *proof = aim->proof;
  double at = read_at(aim), bins = (double)proof->n;
  double f = aim->p->actual[source].hz /
             (proof->rate * (1 + aim->p->timebase));
  *direct = lbr_response_at(aim->response, (f - at) * bins);
  *image = lbr_response_at(aim->response, (-f - at) * bins);
}

static double complex own_part(const lbr_aim *aim) {
  const lbr_actual *own = &aim->p->actual[aim->line];
  double complex direct, image;
  look(aim, aim->line, &direct, &image);
  double complex turn = CMPLX(cos(own->phase), sin(own->phase));
  return own->amplitude * own->gain * (direct * turn + image * conj(turn));
}

static double complex direction_of(double complex own) {
  double size = cabs(own);
  return size > 0 ? own / size : 1;
}

/* Z with: contribution along d = Re(exp(i phi) Z). */
static double complex lever(const lbr_aim *aim, size_t other,
                            double complex d) {
  double complex direct, image;
  look(aim, other, &direct, &image);
  const lbr_actual *a = &aim->p->actual[other];
  return a->amplitude * a->gain * (conj(d) * direct + d * conj(image));
}

static double offset_part(const lbr_aim *aim, double complex d) {
  double complex g = lbr_response_at(
      aim->response, -read_at(aim) * (double)aim->proof->n);
  return 2 * creal(conj(d) * g);
}

double lbr_aim_part(const lbr_aim *aim, size_t other) {
  return cabs(lever(aim, other, direction_of(own_part(aim))));
}

double lbr_aim_ratio(const lbr_aim *aim) {
  const lbr_scene *scene = aim->proof->scene;
  const lbr_claim *claim = &aim->proof->claims[aim->line];
  double amplitude = aim->p->actual[aim->line].amplitude;
  double complex own = own_part(aim), d = direction_of(own);
  double others = scene->offset * fabs(offset_part(aim, d));
  for (size_t j = 0; j < scene->n_sources; j++)
    if (j != aim->line) others += cabs(lever(aim, j, d));
  double read = fmax(cabs(own) + aim->side * others, 0) / claim->gain;
  return aim->side * (read - amplitude) /
         (claim->own * amplitude + claim->others);
}

void lbr_aim_phases(const lbr_aim *aim) {
  const lbr_scene *scene = aim->proof->scene;
  double complex d = direction_of(own_part(aim));
  double turn = aim->side > 0 ? 0 : PI;
  for (size_t j = 0; j < scene->n_sources; j++)
    if (j != aim->line)
      aim->p->actual[j].phase = turn - carg(lever(aim, j, d));
  aim->p->offset =
      copysign(scene->offset, aim->side * offset_part(aim, d));
}
