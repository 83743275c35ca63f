/**
 * `panel.R`: a script that reruns a plan's regressions from the folder in R, on its own code, so that a reader can check
 * ours or go on from there.
 */
import type { Estimate, Filter, Term } from './plan.js';
import { errorsOf, groupingsOf } from './plan.js';
import { poolsArms } from './terms.js';

/** The script for these estimates. Base R alone; nanoparquet or arrow where the panel is Parquet. */
export function rScript(estimates: readonly Estimate[]): string {
  return BODY.replace('@PLAN@', () => `list(\n  ${estimates.map(planOf).join(',\n  ')}\n)`);
}

function planOf(estimate: Estimate): string {
  const terms = (list: readonly Term[] | undefined): string => `list(${(list ?? []).map(literal).join(', ')})`;
  const fields: [string, string][] = [
    ['name', literal(estimate.name)],
    ['method', literal(estimate.method)],
    ['outcome', literal(estimate.outcome)],
    ['covariates', terms(estimate.covariates)],
    ['endogenous', terms(estimate.endogenous)],
    ['instruments', terms(estimate.instruments)],
    ['constant', literal(estimate.constant)],
    ['effects', `list(${groupingsOf(estimate.effects).map(literal).join(', ')})`],
    ['cluster', `list(${groupingsOf(estimate.cluster).map(literal).join(', ')})`],
    ['errors', literal(errorsOf(estimate))],
    [
      'where',
      `list(${Object.entries(estimate.where)
        .map(([name, f]) => `${quoted(name)} = ${filter(f)}`)
        .join(', ')})`,
    ],
    ['draw', literal(estimate.draw !== 'everyone')],
    ['pool_arms', literal(poolsArms(estimate))],
  ];
  return `list(\n    ${fields.map(([key, value]) => `${key} = ${value}`).join(',\n    ')})`;
}

/** A term or value as R writes it: text, number, or a list with the plan's key. */
function literal(value: unknown): string {
  if (typeof value === 'string') return quoted(value);
  if (typeof value === 'boolean') return value ? 'TRUE' : 'FALSE';
  if (typeof value === 'number') return String(value);
  if (Array.isArray(value)) return `list(${value.map(literal).join(', ')})`;
  const entries = Object.entries(value as Record<string, unknown>).filter(([, v]) => v !== undefined);
  return `list(${entries.map(([key, v]) => `${key} = ${literal(v)}`).join(', ')})`;
}

/** A filter as list(range = c(from, to)) or list(among = c(…)). */
function filter(f: Filter): string {
  if (typeof f !== 'object') return `list(among = ${literal(f)})`;
  if (Array.isArray(f)) {
    const numbers = f.length === 2 && f.every((v) => typeof v === 'number');
    return `list(${numbers ? 'range' : 'among'} = c(${f.map(literal).join(', ')}))`;
  }
  if ('in' in f) return `list(among = c(${f.in.map(literal).join(', ')}))`;
  const { from, to } = f as { from?: number; to?: number };
  return `list(range = c(${from ?? '-Inf'}, ${to ?? 'Inf'}))`;
}

function quoted(text: string): string {
  return JSON.stringify(text);
}

const BODY = String.raw`# Reruns the regressions of this folder's plan: Rscript panel.R [FOLDER]
#
# Base R alone; where the panel is a Parquet file, the package nanoparquet or arrow. Conventions: HC1 n/(n-k); clustered
# G/(G-1) (n-1)/(n-k), k counting absorbed effects unless nested in a cluster, t with G-1 degrees of freedom; two-way by
# inclusion and exclusion with the smallest G. Prints each coefficient and standard error and, where estimates.csv is
# there, how far it is from them.

ESTIMATES <- @PLAN@

CONSTANT <- "(const)"
args <- commandArgs(trailingOnly = TRUE)
script <- sub("^--file=", "", grep("^--file=", commandArgs(), value = TRUE))
FOLDER <- if (length(args) > 0) args[1] else if (length(script) > 0) dirname(script[1]) else "."

table_of <- function(name) {
  parquet <- file.path(FOLDER, paste0(name, ".parquet"))
  csv <- file.path(FOLDER, paste0(name, ".csv"))
  if (file.exists(csv)) return(read.csv(csv, check.names = FALSE, na.strings = ""))
  if (!file.exists(parquet)) return(NULL)
  if (requireNamespace("nanoparquet", quietly = TRUE)) return(as.data.frame(nanoparquet::read_parquet(parquet)))
  if (requireNamespace("arrow", quietly = TRUE)) return(as.data.frame(arrow::read_parquet(parquet)))
  stop("reading ", parquet, " needs the package nanoparquet or arrow; or keep the panel as CSV too")
}

key <- function(frame, names) do.call(paste, c(unname(frame[names]), sep = "\r"))

load_panel <- function() {
  panel <- table_of("panel")
  if (is.null(panel)) stop(FOLDER, ": there is no panel.parquet or panel.csv")
  households <- table_of("households")
  if (!is.null(households)) {
    ids <- c("arm", "replicate", "household")
    at <- match(key(panel, ids), key(households, ids))
    for (name in setdiff(names(households), names(panel))) panel[[name]] <- households[[name]][at]
  }
  panel
}

# position of the same household's row a generation on or back
moved <- function(frame, step) {
  ids <- intersect(c("arm", "replicate", "household"), names(frame))
  who <- key(frame, ids)
  match(paste(who, frame$generation + step, sep = "\r"), paste(who, frame$generation, sep = "\r"))
}

# columns of a term by name, at some rows (NA: missing)
values <- function(term, frame, rows) {
  named <- function(x, f) stats::setNames(x, vapply(names(x), f, ""))
  logarithm <- function(x) suppressWarnings(ifelse(x > 0, log(x), NA))
  if (is.character(term)) {
    x <- if (term %in% names(frame)) frame[[term]][rows] else logarithm(frame[[substring(term, 5)]][rows])
    return(stats::setNames(list(as.numeric(x)), term))
  }
  kind <- intersect(names(term), c("log", "square", "power", "product", "lag", "lead", "dummy"))[1]
  inner <- term[[kind]]
  if (kind == "dummy") {
    x <- frame[[inner]][rows]
    present <- unique(x[!is.na(x)])
    if (inner != "arm") present <- if (is.character(present)) sort(present, method = "radix") else sort(present)
    base <- if (is.null(term$base)) present[1] else term$base
    present <- present[present != base]
    return(stats::setNames(lapply(present, function(v) as.numeric(x == v)), paste0(inner, "=", present)))
  }
  if (kind == "log") return(named(lapply(values(inner, frame, rows), logarithm), function(n) paste0("log_", n)))
  if (kind == "square") {
    return(named(lapply(values(inner, frame, rows), function(x) x * x), function(n) paste0("square(", n, ")")))
  }
  if (kind == "power") {
    x <- lapply(values(inner[[1]], frame, rows), function(x) x^inner[[2]])
    return(named(x, function(n) paste0("power(", n, ", ", inner[[2]], ")")))
  }
  if (kind == "product") {
    left <- values(inner[[1]], frame, rows)
    right <- values(inner[[2]], frame, rows)
    out <- list()
    for (a in names(left)) for (b in names(right)) {
      out[[paste0("product(", a, ", ", b, ")")]] <- left[[a]] * right[[b]]
    }
    return(out)
  }
  there <- moved(frame, if (kind == "lag") -1 else 1)[rows]
  named(values(inner, frame, there), function(n) paste0(kind, "(", n, ")"))
}

codes <- function(frame, grouping, rows) {
  columns <- if (is.character(grouping)) grouping else unlist(grouping$product)
  part <- frame[rows, columns, drop = FALSE]
  number <- match(key(part, columns), unique(key(part, columns)))
  number[rowSums(is.na(part)) > 0] <- NA
  number
}

recode <- function(g) match(g, unique(g))

demean <- function(X, effects) {
  if (length(effects) == 0) return(X)
  for (j in seq_len(ncol(X))) {
    x <- X[, j]
    for (sweep in 1:10000) {
      last <- x
      for (g in effects) x <- x - (rowsum(x, g, reorder = TRUE)[, 1] / tabulate(g))[g]
      if (length(effects) < 2 && sweep > 1) break
      if (sqrt(sum((x - last)^2)) <= 1e-12 * max(sqrt(sum(x^2)), 1e-14 * sqrt(sum(last^2)))) break
    }
    X[, j] <- x
  }
  X
}

components <- function(g, h) {
  # labels spread along shared rows until they no longer change
  at <- seq_len(max(g))
  repeat {
    other <- tapply(at[g], h, min)
    new <- as.vector(tapply(other[h], g, min))
    if (all(new == at)) return(length(unique(at)))
    at <- new
  }
}

# rank of the effects' dummies; for three or more an upper bound
rank_of <- function(effects) {
  total <- 0
  for (e in seq_along(effects)) {
    redundant <- 0
    for (b in seq_len(e - 1)) redundant <- max(redundant, components(effects[[b]], effects[[e]]))
    total <- total + max(effects[[e]]) - redundant
  }
  total
}

# columns that are not collinear with those before them, at 1e-9 of their length
independent <- function(X, lengths) {
  kept <- integer()
  basis <- matrix(0, nrow(X), 0)
  for (j in seq_len(ncol(X))) {
    r <- X[, j]
    for (pass in 1:2) if (ncol(basis) > 0) r <- r - as.vector(basis %*% crossprod(basis, r))
    size <- sqrt(sum(r^2))
    if (size > 1e-9 * lengths[j] && size > 0) {
      kept <- c(kept, j)
      basis <- cbind(basis, r / size)
    }
  }
  kept
}

meat <- function(scores, spec, clusters, n, k, effects) {
  if (spec$errors != "clustered") {
    return(crossprod(scores) * (if (spec$errors == "robust") n / (n - k - rank_of(effects)) else 1))
  }
  nested <- function(g) any(vapply(clusters, function(cl) all(tapply(cl, g, function(v) length(unique(v))) == 1), TRUE))
  free <- Filter(function(g) !nested(g), effects)
  sums <- function(g) crossprod(rowsum(scores, g))
  M <- sums(clusters[[1]])
  if (length(clusters) == 2) {
    M <- M + sums(clusters[[2]]) - sums(recode(paste(clusters[[1]], clusters[[2]])))
  }
  G <- min(vapply(clusters, max, 0))
  M * G / (G - 1) * (n - 1) / (n - k - rank_of(free))
}

# two-way clustering can give negative eigenvalues: set to zero
mended <- function(V, clusters) {
  if (length(clusters) == 2) {
    found <- eigen((V + t(V)) / 2, symmetric = TRUE)
    if (any(found$values < (if (any(diag(V) < 0)) 0 else -1e-12 * max(found$values)))) {
      V <- found$vectors %*% (pmax(found$values, 0) * t(found$vectors))
    }
  }
  V
}

fit <- function(spec, frame, drawn) {
  alive <- rep(TRUE, nrow(frame))
  for (name in names(spec$where)) {
    rule <- spec$where[[name]]
    x <- frame[[name]]
    alive <- alive & !is.na(x) & (if (!is.null(rule$range)) x >= rule$range[1] & x <= rule$range[2] else x %in% rule$among)
  }
  if (!is.null(drawn)) alive <- alive & frame$household %in% drawn
  rows <- which(alive)
  all_of <- function(terms) do.call(c, c(list(list()), lapply(terms, values, frame = frame, rows = rows)))
  y <- values(spec$outcome, frame, rows)[[1]]
  W <- all_of(spec$covariates)
  E <- all_of(spec$endogenous)
  Z <- all_of(spec$instruments)
  effects <- lapply(spec$effects, function(g) codes(frame, g, rows))
  clusters <- lapply(spec$cluster, function(g) codes(frame, g, rows))
  keep <- is.finite(y)
  for (x in c(W, E, Z)) keep <- keep & is.finite(x)
  for (g in c(effects, clusters)) keep <- keep & !is.na(g)
  while (length(effects) > 0) {
    before <- sum(keep)
    for (g in effects) {
      size <- tabulate(g[keep], max(g, na.rm = TRUE))
      drop <- size == 1
      if (spec$method == "logit") {
        ones <- tabulate(g[keep & y == 1], length(size))
        drop <- drop | ones == 0 | ones == size
      }
      keep <- keep & !drop[g]
    }
    if (sum(keep) == before) break
  }
  pick <- function(x) if (length(x) == 0) matrix(0, sum(keep), 0) else do.call(cbind, lapply(x, function(v) v[keep]))
  y <- y[keep]
  n <- length(y)
  effects <- lapply(effects, function(g) recode(g[keep]))
  clusters <- lapply(clusters, function(g) recode(g[keep]))
  constant <- matrix(1, n, if (spec$constant && length(effects) == 0) 1 else 0)
  colnames(constant) <- rep(CONSTANT, ncol(constant))
  W <- pick(W)
  E <- pick(E)
  Z <- pick(Z)
  if (spec$method == "logit") return(logit(spec, y, cbind(constant, W), effects, clusters))
  X <- cbind(constant, E, W)
  A <- cbind(constant, W, Z)
  lengths <- sqrt(colSums(X^2))
  alengths <- sqrt(colSums(A^2))
  y <- as.vector(demean(matrix(y), effects))
  X <- demean(X, effects)
  X <- X[, independent(X, lengths), drop = FALSE]
  P <- X
  if (spec$method == "iv") {
    A <- demean(A, effects)
    Q <- qr.Q(qr(A[, independent(A, alengths), drop = FALSE], LAPACK = TRUE))
    P <- Q %*% crossprod(Q, X)
  }
  k <- ncol(X)
  # scaled columns: the normal equations of raw ones can lose every digit
  s <- sqrt(colSums(P^2))
  decomposed <- qr(sweep(P, 2, s, "/"), tol = 0)
  Q <- qr.Q(decomposed)
  half <- solve(qr.R(decomposed)) / s
  b <- as.vector(half %*% crossprod(Q, y))
  e <- as.vector(y - X %*% b)
  df <- n - k - rank_of(effects)
  if (spec$errors == "classical") {
    V <- tcrossprod(half) * sum(e^2) / df
  } else {
    w <- e
    if (spec$errors == "robust-hc3") {
      h <- rowSums(Q^2)
      for (g in effects) h <- h + (1 / tabulate(g))[g]
      w <- e / (1 - h)
    }
    V <- mended(half %*% meat(Q * w, spec, clusters, n, k, effects) %*% t(half), clusters)
  }
  if (spec$errors == "clustered") df <- min(vapply(clusters, max, 0)) - 1
  list(names = colnames(X), b = b, se = sqrt(diag(V)), df = df)
}

logit <- function(spec, y, X, effects, clusters) {
  n <- length(y)
  X <- X[, independent(demean(X, effects), sqrt(colSums(X^2))), drop = FALSE]
  k <- ncol(X)
  full <- X
  for (g in effects) full <- cbind(full, outer(g, seq_len(max(g)), "==") + 0)
  full <- full[, independent(full, sqrt(colSums(full^2))), drop = FALSE]
  s <- sqrt(colSums(full^2))
  A <- sweep(full, 2, s, "/")
  b <- rep(0, ncol(A))
  for (step in 1:100) {
    p <- as.vector(plogis(A %*% b))
    change <- solve(crossprod(A * (p * (1 - p)), A), crossprod(A, y - p))
    b <- b + as.vector(change)
    if (max(abs(change)) < 1e-12 * max(1, abs(b))) break
  }
  p <- as.vector(plogis(A %*% b))
  bread <- solve(crossprod(A * (p * (1 - p)), A))
  V <- bread
  df <- Inf
  if (spec$errors != "classical") {
    w <- y - p
    if (spec$errors == "robust-hc3") w <- w / (1 - p * (1 - p) * rowSums((A %*% bread) * A))
    V <- bread %*% meat(A * w, spec, clusters, n, k, effects) %*% bread
    if (spec$errors == "clustered") df <- min(vapply(clusters, max, 0)) - 1
  }
  V <- mended((V / tcrossprod(s))[1:k, 1:k, drop = FALSE], clusters)
  list(names = colnames(X), b = (b / s)[1:k], se = sqrt(diag(V)), df = df)
}

panel <- load_panel()
optional <- function(name) {
  path <- file.path(FOLDER, name)
  if (file.exists(path)) read.csv(path, check.names = FALSE, na.strings = "") else NULL
}
ours <- optional("estimates.csv")
draws <- optional("estimates_draws.csv")
furthest <- 0
for (spec in ESTIMATES) {
  chosen <- unique(panel$arm)
  if (!is.null(spec$where$arm)) chosen <- chosen[chosen %in% spec$where$arm$among]
  for (group in if (spec$pool_arms) list(chosen) else as.list(chosen)) for (replicate in sort(unique(panel$replicate))) {
    frame <- panel[panel$arm %in% group & panel$replicate == replicate, ]
    arm <- paste(group, collapse = " + ")
    drawn <- NULL
    if (spec$draw) {
      drawn <- draws$household[draws$name == spec$name & draws$arm == arm & draws$replicate == replicate]
    }
    found <- tryCatch(fit(spec, frame, drawn), error = function(problem) {
      cat(sprintf("%s, %s, replicate %d: %s\n", spec$name, arm, replicate, conditionMessage(problem)))
      NULL
    })
    if (is.null(found)) next
    cat(sprintf("\n%s, %s, replicate %d\n", spec$name, arm, replicate))
    for (j in seq_along(found$names)) {
      p <- 2 * pt(-abs(found$b[j] / found$se[j]), found$df)
      cat(sprintf("  %-40s %14.6g %12.6g  p %.4f", found$names[j], found$b[j], found$se[j], p))
      if (!is.null(ours)) {
        same <- ours[ours$name == spec$name & ours$arm == arm & ours$replicate == replicate &
          ours$kind == "coefficient" & ours$term == found$names[j], ]
        apart <- if (nrow(same) == 1) {
          max(abs(found$b[j] - same$estimate) / found$se[j], abs(found$se[j] / same$std_error - 1))
        } else Inf
        furthest <- max(furthest, apart)
        cat(if (is.finite(apart)) sprintf("  apart %.0e", apart) else "  not in estimates.csv")
      }
      cat("\n")
    }
  }
}
if (!is.null(ours)) cat(sprintf("\nfurthest from estimates.csv: %.1e (of a standard error)\n", furthest))
`;
