/**
 * A thin-plate quadrilateral with three dofs a node: deflection w and its slopes.
 *
 * Discrete Kirchhoff: the slope field g ≈ ∇w is an eight-node serendipity field whose
 * values at the mid-sides follow from the corners, along a side (unit tangent t, normal n,
 * length L) from the cubic w, across it linearly:
 *
 *     t·g(mid) = 3 (w_j − w_i) / (2L) − (t·g_i + t·g_j) / 4,    n·g(mid) = (n·g_i + n·g_j) / 2,
 *
 * so no transverse shear exists that could lock. The deflection in the mass is the eight-node
 * field of the same cubics, w(mid) = (w_i + w_j) / 2 + L (t·g_i − t·g_j) / 8.
 *
 * Source: Batoz & Ben Tahar, Int. J. Numer. Methods Eng. 18 (1982) 1655–1677 (stiffness, DKQ);
 * the mass field is our own choice.
 */

/** Geometry of one element; corners counter-clockwise. */
export interface PlateQuad {
  /** Corner coordinates [m], length 4. */
  readonly x: ArrayLike<number>;
  readonly y: ArrayLike<number>;
  /** Angle of each corner's first slope axis against x [rad], length 4; the second axis is a quarter turn on. */
  readonly axis: ArrayLike<number>;
}

/** Coefficient matrices, each 12×12 symmetric, column-major; dofs [w, slope 1, slope 2] corner by corner. */
export interface PlateQuadMatrices {
  /** ∫ κᵀ Q κ dA, Q plane stress for E = 1: times E h³/12 it is the stiffness of a plate. */
  readonly bending: Float64Array;
  /** ∫ w wᵀ dA [m²]: times ρ h it is the mass. */
  readonly area: Float64Array;
  /** ∫ ∇w·∇w dA: times ρ h³/12 it is the rotary inertia. */
  readonly rotary: Float64Array;
}

const CORNERS = 4;
const FIELD = 8;
const DOFS = 12;
const CORNER_XI: readonly number[] = [-1, 1, 1, -1];
const CORNER_ETA: readonly number[] = [-1, -1, 1, 1];

/** Gauss–Legendre points and weights on [−1, 1]: two for the stiffness (as published), three for the mass. */
const TWO_POINTS: readonly (readonly [number, number])[] = [
  [-1 / Math.sqrt(3), 1],
  [1 / Math.sqrt(3), 1],
];
const THREE_POINTS: readonly (readonly [number, number])[] = [
  [-Math.sqrt(0.6), 5 / 9],
  [0, 8 / 9],
  [Math.sqrt(0.6), 5 / 9],
];

/**
 * Matrices of one element.
 *
 * @param poisson - Poisson's ratio ν, dimensionless.
 * @returns matrices that are exact for constant curvature and have exactly the three rigid motions
 * in the null space of `bending`.
 */
export function plateQuadMatrices(quad: PlateQuad, poisson: number): PlateQuadMatrices {
  const field = fieldFromDofs(quad);
  const out: PlateQuadMatrices = {
    bending: new Float64Array(DOFS * DOFS),
    area: new Float64Array(DOFS * DOFS),
    rotary: new Float64Array(DOFS * DOFS),
  };
  const point = newPoint();
  for (const [xi, weightXi] of TWO_POINTS) {
    for (const [eta, weightEta] of TWO_POINTS) {
      evaluatePointInto(point, quad, xi, eta);
      addBendingInto(out.bending, field, point, poisson, weightXi * weightEta * point.jacobian);
    }
  }
  for (const [xi, weightXi] of THREE_POINTS) {
    for (const [eta, weightEta] of THREE_POINTS) {
      evaluatePointInto(point, quad, xi, eta);
      addMassInto(out, field, point, weightXi * weightEta * point.jacobian);
    }
  }
  return out;
}

/** Values at the eight field nodes (4 corners, then the mid-sides 1–2, 2–3, 3–4, 4–1) as 8×12 row-major maps of the dofs. */
interface Field {
  readonly deflection: Float64Array;
  readonly slopeX: Float64Array;
  readonly slopeY: Float64Array;
}

function fieldFromDofs({ x, y, axis }: PlateQuad): Field {
  const deflection = new Float64Array(FIELD * DOFS);
  const slopeX = new Float64Array(FIELD * DOFS);
  const slopeY = new Float64Array(FIELD * DOFS);
  for (let i = 0; i < CORNERS; i++) {
    const row = i * DOFS + 3 * i;
    const cos = Math.cos(axis[i]);
    const sin = Math.sin(axis[i]);
    deflection[row] = 1;
    slopeX[row + 1] = cos;
    slopeX[row + 2] = -sin;
    slopeY[row + 1] = sin;
    slopeY[row + 2] = cos;
  }
  for (let i = 0; i < CORNERS; i++) {
    const j = (i + 1) % CORNERS;
    const length = Math.hypot(x[j] - x[i], y[j] - y[i]);
    const tx = (x[j] - x[i]) / length;
    const ty = (y[j] - y[i]) / length;
    const mid = (CORNERS + i) * DOFS;
    for (let k = 0; k < DOFS; k++) {
      const atI = i * DOFS + k;
      const atJ = j * DOFS + k;
      const alongI = tx * slopeX[atI] + ty * slopeY[atI];
      const alongJ = tx * slopeX[atJ] + ty * slopeY[atJ];
      const acrossI = -ty * slopeX[atI] + tx * slopeY[atI];
      const acrossJ = -ty * slopeX[atJ] + tx * slopeY[atJ];
      const along = (1.5 * (deflection[atJ] - deflection[atI])) / length - (alongI + alongJ) / 4;
      const across = (acrossI + acrossJ) / 2;
      slopeX[mid + k] = along * tx - across * ty;
      slopeY[mid + k] = along * ty + across * tx;
      deflection[mid + k] = (deflection[atI] + deflection[atJ]) / 2 + (length * (alongI - alongJ)) / 8;
    }
  }
  return { deflection, slopeX, slopeY };
}

/** Shape values, derivatives in x and y, and area factor at one integration point. */
interface Point {
  readonly shape: Float64Array;
  readonly shapeX: Float64Array;
  readonly shapeY: Float64Array;
  jacobian: number;
}

function newPoint(): Point {
  return {
    shape: new Float64Array(FIELD),
    shapeX: new Float64Array(FIELD),
    shapeY: new Float64Array(FIELD),
    jacobian: 0,
  };
}

function evaluatePointInto(point: Point, { x, y }: PlateQuad, xi: number, eta: number): void {
  let xXi = 0;
  let xEta = 0;
  let yXi = 0;
  let yEta = 0;
  for (let i = 0; i < CORNERS; i++) {
    const byXi = (CORNER_XI[i] * (1 + CORNER_ETA[i] * eta)) / 4;
    const byEta = (CORNER_ETA[i] * (1 + CORNER_XI[i] * xi)) / 4;
    xXi += byXi * x[i];
    yXi += byXi * y[i];
    xEta += byEta * x[i];
    yEta += byEta * y[i];
  }
  point.jacobian = xXi * yEta - xEta * yXi;
  for (let a = 0; a < FIELD; a++) {
    const [value, byXi, byEta] = serendipity(a, xi, eta);
    point.shape[a] = value;
    point.shapeX[a] = (yEta * byXi - yXi * byEta) / point.jacobian;
    point.shapeY[a] = (-xEta * byXi + xXi * byEta) / point.jacobian;
  }
}

/** Eight-node serendipity shape function a: value, ∂/∂ξ, ∂/∂η. */
function serendipity(a: number, xi: number, eta: number): readonly [number, number, number] {
  if (a < CORNERS) {
    const p = CORNER_XI[a];
    const q = CORNER_ETA[a];
    return [
      ((1 + p * xi) * (1 + q * eta) * (p * xi + q * eta - 1)) / 4,
      (p * (1 + q * eta) * (2 * p * xi + q * eta)) / 4,
      (q * (1 + p * xi) * (p * xi + 2 * q * eta)) / 4,
    ];
  }
  if (a % 2 === 0) {
    const q = a === CORNERS ? -1 : 1;
    return [((1 - xi * xi) * (1 + q * eta)) / 2, -xi * (1 + q * eta), (q * (1 - xi * xi)) / 2];
  }
  const p = a === CORNERS + 1 ? 1 : -1;
  return [((1 - eta * eta) * (1 + p * xi)) / 2, (p * (1 - eta * eta)) / 2, -eta * (1 + p * xi)];
}

function addBendingInto(
  target: Float64Array,
  { slopeX, slopeY }: Field,
  { shapeX, shapeY }: Point,
  poisson: number,
  weight: number,
): void {
  const bendX = new Float64Array(DOFS);
  const bendY = new Float64Array(DOFS);
  const twist = new Float64Array(DOFS);
  for (let a = 0; a < FIELD; a++) {
    for (let k = 0; k < DOFS; k++) {
      const gx = slopeX[a * DOFS + k];
      const gy = slopeY[a * DOFS + k];
      bendX[k] += shapeX[a] * gx;
      bendY[k] += shapeY[a] * gy;
      twist[k] += shapeY[a] * gx + shapeX[a] * gy;
    }
  }
  const direct = weight / (1 - poisson * poisson);
  const shear = weight / (2 * (1 + poisson));
  for (let k = 0; k < DOFS; k++) {
    const momentX = direct * (bendX[k] + poisson * bendY[k]);
    const momentY = direct * (bendY[k] + poisson * bendX[k]);
    for (let l = 0; l < DOFS; l++) {
      target[l + k * DOFS] += bendX[l] * momentX + bendY[l] * momentY + shear * twist[l] * twist[k];
    }
  }
}

function addMassInto(
  target: PlateQuadMatrices,
  { deflection, slopeX, slopeY }: Field,
  { shape }: Point,
  weight: number,
): void {
  const w = new Float64Array(DOFS);
  const gx = new Float64Array(DOFS);
  const gy = new Float64Array(DOFS);
  for (let a = 0; a < FIELD; a++) {
    for (let k = 0; k < DOFS; k++) {
      w[k] += shape[a] * deflection[a * DOFS + k];
      gx[k] += shape[a] * slopeX[a * DOFS + k];
      gy[k] += shape[a] * slopeY[a * DOFS + k];
    }
  }
  for (let k = 0; k < DOFS; k++) {
    for (let l = 0; l < DOFS; l++) {
      target.area[l + k * DOFS] += weight * w[l] * w[k];
      target.rotary[l + k * DOFS] += weight * (gx[l] * gx[k] + gy[l] * gy[k]);
    }
  }
}
