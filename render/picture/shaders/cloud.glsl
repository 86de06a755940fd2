// A layer of broken cloud, thin against its height: from below grey in the middle, bright at the edges, from above white.
vec4 cloudColour() {
  vec3 ray = place - eye;
  float d = length(ray);
  vec2 p = place.xy;
  float px = length(fwidth(p));
  float n = 0.56 * noise(p * (1.0 / 1900.0)) + 0.28 * noise(p.yx * (1.0 / 640.0) + 5.3) + 0.16 * mix(0.5, noise(p * (1.0 / 210.0) + 9.1), shown(210.0, px));
  float thick = n - 0.50;                       // about half of the sky
  float cover = clamp(thick * 11.0, 0.0, 1.0);
  float deep = clamp(thick * 5.0, 0.0, 1.0);
  vec3 white = sunLight * 0.62 + skyLight * 0.42, grey = skyLight * 0.85 + sunLight * 0.16;
  vec3 top = min((sunLight * 0.80 + skyLight * 0.66) * (0.92 + 0.5 * (n - 0.5)), vec3(1.0));
  vec3 colour = ray.z > 0.0 ? mix(white, grey, deep) : top;
  float y = min(extinction * d * (1.0 / 32.0), 1.0);
  float left = 1.0 - y + 0.5 * y * y;
  left *= left; left *= left; left *= left; left *= left; left *= left;
  float level = abs(ray.z) / d;                 // toward the horizon gaps close and haze takes over
  return vec4(mix(rimAt, colour, left), cover * clamp(level * 30.0, 0.0, 1.0) * fade * clamp(left * 6.0, 0.0, 1.0));
}
