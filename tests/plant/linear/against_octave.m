# Random systems that print_systems judged, judged again by Octave's control package (SLICOT).
#
#     octave-cli --norc against_octave.m PRINT_SYSTEMS SEED COUNT
pkg load control
warning("off", "all");

function m = matrix_of(v)
  m = reshape(v(3:end), v(2), v(1))';
end

# Largest distance between partners, nearest pairs first.
function worst = apart(ours, theirs)
  worst = 0;
  ours = ours(:); theirs = theirs(:);
  while ! isempty(ours)
    [low, which] = min(abs(ours - theirs.')(:));
    [i, j] = ind2sub([numel(ours), numel(theirs)], which);
    worst = max(worst, low);
    ours(i) = []; theirs(j) = [];
  end
end

global failed largest
failed = 0; largest = struct();
function expect(name, at, err, allowed)
  global failed largest
  if err == 0 ratio = 0; else ratio = err / allowed; end
  if ! (ratio <= 1)
    failed++;
    printf("system %d: %s: error %.3g, allowed %.3g\n", at, name, err, allowed);
  end
  if ! isfield(largest, name) largest.(name) = 0; end
  largest.(name) = max(largest.(name), ratio);
end

count = 0;
file = popen(["'" argv(){1} "' " argv(){2} " " argv(){3}], "r");
while ischar(text = fgetl(file))
  line = jsondecode(text);
  count++;
  at = line.at;
  get = @(name) matrix_of(line.(name));
  A = get("given_A"); B = get("given_B"); C = get("given_C"); D = get("given_D");
  n = rows(A);
  discrete = line.period_s > 0;
  if discrete
    sys = ss(A, B, C, D, line.period_s);
  else
    sys = ss(A, B, C, D);
  end

  # Eigenvalues: eps ||A|| times the condition of the eigenvectors (Bauer and Fike), 10 n for both libraries' constants.
  [V, ~] = eig(A);
  p = get("poles");
  expect("poles", at, apart(complex(p(:,1), p(:,2)), pole(sys)), 10 * n * eps * norm(A) * cond(V));

  # A transfer function of lower rank than it could have: what is a zero of it depends on the tolerance. So it does for the
  # modes of a pencil that is not square, where SLICOT's default takes a hidden mode for none; those are counted by
  # construction in against_scipy.py.
  z = get("invariant_zeros");
  s = 0.3 + 0.4i;
  theirs = zero(sys);
  G = C * ((s * eye(n) - A) \ B) + D;
  if norm(G) > 1e-12 * norm(C) * norm(B) && (rows(D) == columns(D) || ! any(line.parts(2:4)))
    expect("zeros_count", at, abs(rows(z) - numel(theirs)), 0.5);
    if rows(z) == numel(theirs) && ! isempty(theirs)
      # Condition of the zero, from the null vectors of the pencil there; of a pencil that is not square only the residual.
      allowed = 0;
      for zero_at = complex(z(:,1), z(:,2)).'
        pencil = [A - zero_at * eye(n), B; C, D];
        [U, S, W] = svd(pencil);
        k = min(size(pencil));
        slope = abs(U(1:n,k)' * W(1:n,k));
        if rows(pencil) != columns(pencil)
          # Null vectors are not single on the longer side: the smallest slope over that side's null space is zero.
          slope = min(slope, 1e-3);
        end
        allowed = max(allowed, 1e3 * n * eps * (norm(pencil) + abs(zero_at)) / max(slope, realmin));
      end
      expect("zeros", at, apart(complex(z(:,1), z(:,2)), theirs), allowed);
    end
  end

  small = minreal(sys, 1e-9);
  expect("minimal_order", at, abs(rows(small.a) - line.minimal_A(1)), 0.5);
  # TB01PD keeps what our minimal realisation keeps: Markov parameters, relative to |C| |A|^k |B|.
  if rows(small.a) == line.minimal_A(1) && rows(small.a) > 0
    x = small.b; y = get("minimal_B"); E = get("minimal_A"); F = get("minimal_C");
    for k = 0:2*n
      expect("Markov", at, norm(small.c * x - F * y), 1e4 * n * eps * norm(C) * norm(A)^k * norm(B));
      x = small.a * x; y = E * y;
    end
  end

  if isfield(line, "Wc")
    for which = "co"
      W = gram(sys, which);
      if which == "c" a = A; else a = A'; end
      if discrete K = kron(a, a) - eye(n^2); else K = kron(a, eye(n)) + kron(eye(n), a); end
      expect(["Gramian_" which], at, norm(W - get(["W" which])), 10 * n * eps * cond(K) * max(norm(W), realmin));
    end
    h = get("hankel");
    theirs = hsvd(sys);
    if ! isempty(h) && norm(h) > 0
      # Squares: those are what rounding of the Gramians moves.
      size_w = norm(get("Wc")) * norm(get("Wo"));
      theirs = sort(theirs(:), "descend")(1:numel(h));
      expect("Hankel", at, max(abs(h(:).^2 - theirs.^2)), 1e3 * n * eps * size_w);
    end
  end

  if ! discrete
    d = c2d(sys, 0.05, "zoh");
    expect("hold_A", at, norm(d.a - get("zero_order_hold_A")), 100 * eps * max(1, norm(d.a)));
    expect("hold_B", at, norm(d.b - get("zero_order_hold_B")), 100 * eps * max(1, norm(d.b)));
    # Tustin's states may be scaled otherwise: the transfer function at a point.
    d = c2d(sys, 0.05, "tustin");
    q = exp(0.7i);
    theirs = d.c * ((q * eye(n) - d.a) \ d.b) + d.d;
    M = q * eye(n) - get("tustin_A");
    ours = get("tustin_C") * (M \ get("tustin_B")) + get("tustin_D");
    expect("tustin", at, norm(ours - theirs), 100 * n * eps * cond(M) * (norm(D) + norm(B) * norm(C) / min(svd(M))));
  end

  M = discrete * eye(n) - A;
  expect("DC_gain", at, norm(dcgain(sys) - get("dc_gain")), 100 * eps * cond(M) * (norm(D) + norm(B) * norm(C) / min(svd(M))));
end
pclose(file);
for [ratio, name] = largest
  printf("%-16s largest error / allowed %.2g\n", name, ratio);
end
printf("%d systems, %d failed\n", count, failed);
if failed || ! count
  exit(1);
end
