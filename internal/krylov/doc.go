// Package krylov holds Lanczos processes for a symmetric pencil K, M with K positive
// semi-definite and M positive definite: what exp(-t A) and its relatives do to a
// vector (Process), and the smallest eigenpairs (Smallest). A = M⁻¹K is never formed.
//
// All of them work with one factored matrix M + γK through two functions of the
// caller's: x ↦ M x and b ↦ (M + γK)⁻¹ b. The operator that the processes see is
//
//	B = (M + γK)⁻¹ M = (I + γA)⁻¹,
//
// symmetric in the inner product ⟨x, y⟩ = xᵀ M y, with eigenvalues in (0, 1]. The
// stiffest modes, which need no care, are those that B makes small; so the number of
// steps does not grow as a mesh is refined.
//
// Bases are kept orthonormal by a full pass against all earlier vectors. Sums over
// vector entries run in blocks of fixed size whose results are added in order:
// results do not depend on the number of workers.
package krylov
