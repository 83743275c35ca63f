/**
 * Shaders of the fields: households as points, ties as lines, both gliding between two placements.
 *
 * A position is `mix(from, to, glide)` in field pixels before the camera; the camera is a zoom and a shift; `view` is
 * the whole canvas in the same pixels. Shapes are distance functions on the point's own square, so a disc becomes a
 * ring by letting a hole grow. Colours are premultiplied on the way out.
 */

const place = `
uniform vec2 uView;
uniform vec3 uCamera;
uniform vec2 uOrigin;
uniform float uGlide;
vec4 placed(vec2 a, vec2 b) {
  vec2 p = mix(a, b, uGlide) * uCamera.x + uCamera.yz + uOrigin;
  return vec4(p.x / uView.x * 2.0 - 1.0, 1.0 - p.y / uView.y * 2.0, 0.0, 1.0);
}
`;

export const pointVertex = `#version 300 es
precision highp float;
in vec2 aFrom;
in vec2 aTo;
in vec4 aColourFrom;
in vec4 aColourTo;
in vec4 aShape;
uniform float uSize;
uniform float uDensity;
uniform float uHalo;
out vec4 vColour;
out float vHole;
out float vRadius;
out float vHalo;
out float vSharp;
${place}
void main() {
  gl_Position = placed(aFrom, aTo);
  vColour = mix(aColourFrom, aColourTo, uGlide);
  vHole = mix(aShape.x, aShape.y, uGlide);
  vHalo = aShape.w * uHalo;
  float radius = uSize * (0.5 + 2.0 * aShape.z) * (1.0 + 0.34 * vHole) * uDensity;
  float reach = radius * (vHalo > 0.0 ? 2.0 : 1.0) + 1.0;
  vRadius = radius / reach;
  vSharp = reach;
  gl_PointSize = 2.0 * reach;
}
`;

export const pointFragment = `#version 300 es
precision mediump float;
in vec4 vColour;
in float vHole;
in float vRadius;
in float vHalo;
in float vSharp;
uniform vec4 uPaper;
out vec4 outColour;
void main() {
  // distances in shares of the point's reach; edges are soft over one device pixel
  float d = length(gl_PointCoord * 2.0 - 1.0);
  float disc = clamp((vRadius - d) * vSharp + 0.5, 0.0, 1.0);
  float inner = vRadius * 0.46 * vHole;
  float hole = clamp((inner - d) * vSharp + 0.5, 0.0, 1.0) * step(0.01, vHole);
  vec4 ink = vec4(vColour.rgb, 1.0) * vColour.a;
  vec4 mark = mix(ink, uPaper * 0.8, hole) * disc;
  if (vHalo > 0.0) {
    // a thin circle round the mark: seen at once, then quiet
    float at = vRadius + (1.0 - vRadius) * 0.66;
    float halo = vHalo * clamp(1.0 - abs(d - at) * vSharp, 0.0, 1.0);
    mark += vec4(vColour.rgb, 1.0) * halo * (1.0 - mark.a);
  }
  outColour = mark;
}
`;

export const lineVertex = `#version 300 es
precision highp float;
in vec2 aFrom;
in vec2 aTo;
${place}
void main() {
  gl_Position = placed(aFrom, aTo);
}
`;

export const lineFragment = `#version 300 es
precision mediump float;
uniform vec4 uInk;
out vec4 outColour;
void main() {
  outColour = vec4(uInk.rgb, 1.0) * uInk.a;
}
`;
