// Where the arm stands and how fast its tool point can go: plain lists of numbers, in metres and world axes.

export function column(pose, k) {
  return [pose[0][k], pose[1][k], pose[2][k]];
}

export function along(from, by, direction) {
  return from.map((v, r) => v + by * direction[r]);
}

function product(a, b) {
  return a.map((row) => [0, 1, 2, 3].map((c) => row[0] * b[0][c] + row[1] * b[1][c] + row[2] * b[2][c] + (c > 2 ? row[3] : 0)));
}

// The posture at kept sample i: `points`, each joint's origin, flange and tool point; `roots`, where each joint's slide begins; `axes`, the
// joints' directions; `tool`, the tool's pose. Null where the path was not reached. Follows skeleton (skeleton.py).
export function postureAt(facts, data, i) {
  const points = [], roots = [], axes = [];
  let pose = facts.base;
  facts.links.forEach((link, k) => {
    pose = product(pose, link);
    roots.push(column(pose, 3));
    if (data.joints[k]) {
      const q = data.joints[k][i], c = Math.cos(q), s = Math.sin(q);
      axes.push(column(pose, 2));
      pose = pose.map(([x, y, z, at]) => (facts.prismatic[k] ? [x, y, z, at + q * z] : [c * x + s * y, c * y - s * x, z, at]));
    }
    points.push(column(pose, 3));
  });
  const tool = product(pose, facts.tool);
  points.push(column(tool, 3));
  return Number.isFinite(tool[0][0] + tool[0][3]) ? { points, roots, axes, tool } : null;
}

// The velocity ellipsoid of the tool point (T. Yoshikawa, Int. J. Robotics Research 4(2), 1985) for joint speeds in shares of their limits:
// `w`, (m/s)^2, is the sum of J_i J_i^T limit_i^2; `axes` are [half axis in m/s, direction], longest first.
export function velocityEllipsoid(facts, { points, axes }) {
  const tool = points.at(-1);
  const columns = axes.map(([a, b, c], k) => {
    const [x, y, z] = along(tool, -1, points[k]);
    return (facts.prismatic[k] ? axes[k] : [b * z - c * y, c * x - a * z, a * y - b * x]).map((v) => v * facts.joint_speed[k]);
  });
  const w = [0, 1, 2].map((r) => [0, 1, 2].map((c) => columns.reduce((sum, j) => sum + j[r] * j[c], 0)));
  return { w, axes: principal(w).map(([value, direction]) => [Math.sqrt(Math.max(0, value)), direction]) };
}

// [value, unit vector] of a symmetric 3 x 3 matrix, largest first: Jacobi's rotations, which settle in fewer than the six rounds.
export function principal(matrix) {
  let a = matrix, v = [[1, 0, 0], [0, 1, 0], [0, 0, 1]];
  for (let k = 0; k < 18; k++) {
    const p = k % 3, q = (k + 1) % 3, gap = a[q][q] - a[p][p];
    const angle = 0.5 * Math.atan2(gap < 0 ? -2 * a[p][q] : 2 * a[p][q], Math.abs(gap)), c = Math.cos(angle), s = Math.sin(angle);
    const turned = (rows) => rows.map((row) => row.map((value, n) => (n === p ? c * value - s * row[q] : n === q ? s * row[p] + c * value : value)));
    const half = turned(a);
    a = turned([0, 1, 2].map((r) => half.map((row) => row[r])));
    v = turned(v);
  }
  return [0, 1, 2].map((k) => [a[k][k], v.map((row) => row[k])]).sort((one, other) => other[0] - one[0]);
}
