/* What heat.py needs of CHOLMOD: order a symmetric matrix and analyse it once, then
   factor and solve as often as asked. run.sh compiles it into a scratch folder.

   The matrix is its lower triangle by columns, 32-bit row numbers in rising order. It stays
   the caller's, who keeps it where it is. Functions return CHOLMOD's status, 0 if all went well. */

#include <cholmod.h>
#include <string.h>

static cholmod_common common;
static cholmod_sparse matrix;
static cholmod_factor *factor;

int peer_analyse(int n, int *column, int *row, double *value, int metis) {
  cholmod_start(&common);
  /* One ordering and no other: with its defaults CHOLMOD tries minimum degree first, and
     would pay for both. */
  common.nmethods = 1;
  common.method[0].ordering = metis ? CHOLMOD_METIS : CHOLMOD_AMD;
  common.postorder = 1;
  matrix.nrow = matrix.ncol = n;
  matrix.nzmax = column[n];
  matrix.p = column;
  matrix.i = row;
  matrix.x = value;
  matrix.stype = -1; /* symmetric, of which the lower triangle */
  matrix.itype = CHOLMOD_INT;
  matrix.xtype = CHOLMOD_REAL;
  matrix.dtype = CHOLMOD_DOUBLE;
  matrix.sorted = matrix.packed = 1;
  factor = cholmod_analyze(&matrix, &common);
  return common.status;
}

/* What the analysis foretells: nonzeros of the factor, operations, and how it will be stored. */
void peer_foretold(double *nonzeros, double *operations, int *supernodal) {
  *nonzeros = common.lnz;
  *operations = common.fl;
  *supernodal = factor->is_super;
}

int peer_factor(double *value) {
  matrix.x = value;
  cholmod_factorize(&matrix, factor, &common);
  return common.status;
}

int peer_solve(double *right, double *solution) {
  cholmod_dense b = {.nrow = matrix.nrow, .ncol = 1, .nzmax = matrix.nrow, .d = matrix.nrow,
                     .x = right, .xtype = CHOLMOD_REAL, .dtype = CHOLMOD_DOUBLE};
  cholmod_dense *x = cholmod_solve(CHOLMOD_A, factor, &b, &common);
  if (x) {
    memcpy(solution, x->x, matrix.nrow * sizeof(double));
    cholmod_free_dense(&x, &common);
  }
  return common.status;
}
