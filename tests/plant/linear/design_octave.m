% Recomputes gains, Riccati solutions, poles and responses of random systems with Octave's control package.
%
%   octave-cli design_octave.m DESIGN_SAMPLES SEED COUNT
%
% Tolerance: two backward stable solvers may differ by what a relative change of the data of 1e-12 does to the answer; that is measured, by
% solving with data so changed.
pkg load control
warning ("off", "all");  % on gains that are large for their plant: they are meant to be
words = argv ();
[status, text] = system (sprintf ("'%s' %s %s", words{:}));
assert (status, 0);
cases = jsondecode (text);
assert (numel (cases), str2double (words{3}));
rand ("seed", 7);

function d = distance (a, b)
  d = norm (a(:) - b(:)) / max (norm (b(:)), 1e-300);
end

function s = sys_of (A, B, C, D, discrete)
  if discrete
    s = ss (A, B, C, D, 0.1);
  else
    s = ss (A, B, C, D);
  end
end

% Answers in one cell: regulator's K, P, filter's L, P, step, frequency response, placed K.
function answers = solve (d)
  if d.discrete
    [K, P] = dlqr (d.A, d.B, d.Q, d.R, d.N);
    [~, PF] = dlqr (d.A', d.C', d.W, d.V);
    L = d.A * PF * d.C' / (d.C * PF * d.C' + d.V);
  else
    [K, P] = lqr (d.A, d.B, d.Q, d.R, d.N);
    [LT, PF] = lqr (d.A', d.C', d.W, d.V);
    L = LT';
  end
  s = sys_of (d.A, d.B(:, 1), d.C, d.D(:, 1), d.discrete);
  [y, ~] = lsim (s, ones (11, 1), 0.1 * (0:10)');
  H = freqresp (sys_of (d.A, d.B, d.C, d.D, d.discrete), d.frequency);
  answers = {K, P, L, PF, y, H(:, :, 1)};
  if columns (d.B) == 1 && rows (d.A) <= 8
    answers{7} = place (d.A, d.B, d.wished);
  end
end

function d = shaken (d)
  for name = {"A", "B", "C", "D", "Q", "R", "N", "W", "V"}
    m = d.(name{1});
    m = m .* (1 + 1e-12 * (2 * rand (size (m)) - 1));
    if any (name{1} == "QRWV")
      m = (m + m') / 2;
    end
    d.(name{1}) = m;
  end
end

names = {"lqr K", "lqr P", "kalman L", "kalman P", "step", "frequency", "place K, one input"};
worst = zeros (1, numel (names));
failed = 0;
for i = 1:numel (cases)
  c = cases(i);
  if iscell (cases)
    c = cases{i};
  end
  d = struct ("discrete", c.discrete, "frequency", c.frequency);
  n = c.order;
  m = numel (c.B) / n;
  p = numel (c.C) / n;
  % A single row or column comes back from the decoder without its shape.
  d.A = reshape (c.A, n, n);
  d.B = reshape (c.B, n, m);
  d.C = reshape (c.C, p, n);
  d.D = reshape (c.D, p, m);
  d.Q = reshape (c.Q, n, n);
  d.R = reshape (c.R, m, m);
  d.N = reshape (c.N, n, m);
  d.W = reshape (c.W, n, n);
  d.V = reshape (c.V, p, p);
  d.wished = c.place.wished(:, 1) + 1i * c.place.wished(:, 2);
  ours = {reshape(c.lqr.K, m, n), c.lqr.P, reshape(c.kalman.L, n, p), c.kalman.P, reshape(c.step, 11, p), ...
          reshape(c.re, p, m) + 1i * reshape(c.im, p, m), reshape(c.place.K, m, n)};
  reference = solve (d);
  moved = zeros (1, numel (reference));
  for k = 1:2
    other = solve (shaken (d));
    for j = 1:numel (reference)
      moved(j) = max (moved(j), distance (other{j}, reference{j}));
    end
  end
  for j = 1:numel (reference)
    found = distance (ours{j}, reference{j});
    allowed = max (1e-13, 5 * moved(j));
    worst(j) = max (worst(j), found / allowed);
    if ! (found <= allowed)
      printf ("case %d: %s differs by %.2e, allowed %.2e\n", i - 1, names{j}, found, allowed);
      failed++;
    end
  end
end
for j = 1:numel (names)
  printf ("%s: largest share of the tolerance %.2g\n", names{j}, worst(j));
end
if failed
  exit (1);
end
printf ("%d systems agree\n", numel (cases));
