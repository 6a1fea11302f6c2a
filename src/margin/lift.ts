import { type ComplexVector, complexVector, type DenseMatrix } from "../numerics/dense/matrix.js";
import { denseOperator } from "../numerics/real-operator.js";

/** V z: a reduced vector on the full model's dofs. z may be shorter than V is wide (the basis has grown since). */
export function liftBy(basis: DenseMatrix, reduced: ComplexVector): ComplexVector {
  const cols = reduced.re.length;
  const v = denseOperator({ rows: basis.rows, cols, values: basis.values });
  const out = complexVector(basis.rows);
  v.addInto(out, 1, 0, reduced);
  return out;
}
