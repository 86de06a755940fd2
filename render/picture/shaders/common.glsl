// Shared by every piece of the land: light, haze, noise. Display axes: x east, y north, z up; metres.
in vec3 place;                  // where this fragment is
// VTK declares: uniform vec3 eye; where it is seen from
// VTK declares: uniform vec3 sunDir; toward the sun
// VTK declares: uniform vec3 sunLight; colour of direct light on a face turned to the sun
// VTK declares: uniform vec3 skyLight; colour of the light from the whole sky
// VTK declares: uniform vec3 rimColour; the sky at the horizon, away from the sun
// VTK declares: uniform vec3 rimGlow; what the horizon under the sun has more
// VTK declares: uniform float extinction; per metre

vec3 rim(vec3 look) {           // the sky's colour at the horizon in this direction
  float s = max(dot(look.xy, sunDir.xy) * inversesqrt((dot(look.xy, look.xy) + 1e-6) * (dot(sunDir.xy, sunDir.xy) + 1e-6)), 0.0);
  s *= s;
  return rimColour + rimGlow * s * s;
}
vec3 haze(vec3 colour, vec3 ray) {
  float d = length(ray);
  float left = exp(-extinction * d) * (1.0 - smoothstep(38000.0, 58000.0, d));
  return mix(rim(ray), colour, left);
}
float noise(vec2 p) {           // detail only: nothing else has to know it
  vec2 i = floor(p), f = p - i;
  f = f * f * (3.0 - 2.0 * f);
  vec2 a = 50.0 * fract(i * 0.3183099 + 0.071), b = 50.0 * fract(i * 0.3183099 + 0.3893099);
  vec4 h = fract(vec4(a.x * a.y * (a.x + a.y), b.x * a.y * (b.x + a.y), a.x * b.y * (a.x + b.y), b.x * b.y * (b.x + b.y)));
  vec2 r = mix(h.xz, h.yw, f.x);
  return mix(r.x, r.y, f.y);
}
