# Reference values from base R (packages stats and datasets only).
#
#   Rscript tests/references/r_reference.R
#
# writes r_reference.json beside itself. The tests read that file; R is not needed to run them.
# Series are named, not copied: `n` and `sum` show that a reader has the same ones.

write_json <- function(x, indent = "") {
  if (is.list(x)) {
    inner <- paste0(indent, " ")
    entries <- vapply(names(x), function(k) paste0(inner, "\"", k, "\": ", write_json(x[[k]], inner)), "")
    return(paste0("{\n", paste(entries, collapse = ",\n"), "\n", indent, "}"))
  }
  if (is.character(x)) return(paste0("\"", x, "\""))
  if (is.logical(x)) return(tolower(as.character(x)))
  if (any(!is.finite(x))) stop("a value is not finite")
  numbers <- sprintf("%.13g", unname(as.vector(x)))
  if (length(x) == 1 && !inherits(x, "AsIs")) numbers else paste0("[", paste(numbers, collapse = ", "), "]")
}

all_of <- function(x) I(as.numeric(x))

series <- list(
  Nile = Nile, LakeHuron = LakeHuron, treering = treering, nhtemp = nhtemp, austres = austres,
  WWWusage = WWWusage, BJsales = BJsales, uspop = uspop, nottem = nottem, USAccDeaths = USAccDeaths,
  UKgas = UKgas, AirPassengers = AirPassengers, JohnsonJohnson = JohnsonJohnson, ldeaths = ldeaths
)

# Simple smoothing, Holt and Winters: start values as R finds them, constants fixed or optimised ------------------

winters <- function(name, horizon, ...) {
  x <- series[[name]]
  fit <- HoltWinters(x, ...)
  first <- length(x) - nrow(fit$fitted) # periods behind the start values
  has <- function(value) !is.logical(value) || value
  k <- fit$coefficients
  m <- if (has(fit$gamma)) frequency(x) else 0
  start <- list(after = first, level = fit$fitted[1, "level"])
  constants <- list(alpha = fit$alpha)
  final <- list(level = k[[1]])
  if (has(fit$beta)) {
    start$trend <- fit$fitted[1, "trend"]
    constants$beta <- fit$beta
    final$trend <- k[[2]]
  }
  if (m > 0) {
    start$season <- all_of(decompose(ts(x[1:(2 * m)], frequency = m), fit$seasonal)$figure)
    constants$gamma <- fit$gamma
    final$season <- all_of(tail(k, m)) # the first is that of the first period ahead
  }
  ahead <- predict(fit, horizon, prediction.interval = TRUE)
  half <- ahead[, "upr"] - ahead[, "fit"]
  list(series = name, season = if (m > 0) fit$seasonal else "none", season_length = max(m, 1), start = start,
       constants = constants, final = final, sse = fit$SSE, fitted = all_of(fit$fitted[, "xhat"]),
       forecast = all_of(ahead[, "fit"]), variance_by_lead = all_of((half / half[1])^2))
}

holt_winters <- list(
  ses_nile = winters("Nile", 6, alpha = 0.2, beta = FALSE, gamma = FALSE),
  ses_lakehuron = winters("LakeHuron", 6, alpha = 0.75, beta = FALSE, gamma = FALSE),
  holt_austres = winters("austres", 6, alpha = 0.9, beta = 0.3, gamma = FALSE),
  holt_uspop = winters("uspop", 6, alpha = 0.6, beta = 0.4, gamma = FALSE),
  additive_nottem = winters("nottem", 15, alpha = 0.1, beta = 0.05, gamma = 0.2),
  additive_accidents = winters("USAccDeaths", 15, alpha = 0.6, beta = 0.02, gamma = 0.5),
  multiplicative_airline = winters("AirPassengers", 15, alpha = 0.3, beta = 0.05, gamma = 0.6,
                                   seasonal = "multiplicative"),
  multiplicative_gas = winters("UKgas", 7, alpha = 0.2, beta = 0.1, gamma = 0.7, seasonal = "multiplicative"),
  multiplicative_deaths = winters("ldeaths", 15, alpha = 0.1, beta = 0.01, gamma = 0.3,
                                  seasonal = "multiplicative")
)
holt_winters_optimised <- list(
  ses_nile = winters("Nile", 6, beta = FALSE, gamma = FALSE),
  ses_temperature = winters("nhtemp", 6, beta = FALSE, gamma = FALSE),
  holt_uspop = winters("uspop", 6, gamma = FALSE),
  holt_austres = winters("austres", 6, gamma = FALSE),
  additive_accidents = winters("USAccDeaths", 15),
  additive_nottem = winters("nottem", 15),
  additive_deaths = winters("ldeaths", 15),
  multiplicative_airline = winters("AirPassengers", 15, seasonal = "multiplicative"),
  multiplicative_gas = winters("UKgas", 7, seasonal = "multiplicative"),
  multiplicative_johnson = winters("JohnsonJohnson", 7, seasonal = "multiplicative")
)

# STL: straight lines in the season's smoother, no jumps, five inner turns, no robustness weights ------------------

taken_apart <- function(name, take_log) {
  x <- if (take_log) log10(series[[name]]) else series[[name]]
  parts <- stl(x, s.window = 13, s.degree = 1, s.jump = 1, t.jump = 1, l.jump = 1, inner = 5, outer = 0)
  list(series = name, log10 = take_log, season_length = frequency(x), windows = all_of(parts$win),
       season = all_of(parts$time.series[, "seasonal"]), trend = all_of(parts$time.series[, "trend"]))
}

decomposed <- list(
  nottem = taken_apart("nottem", FALSE), accidents = taken_apart("USAccDeaths", FALSE),
  log_airline = taken_apart("AirPassengers", TRUE), log_gas = taken_apart("UKgas", TRUE),
  log_johnson = taken_apart("JohnsonJohnson", TRUE)
)

locally_smoothed <- function(name, share) {
  x <- as.numeric(series[[name]])
  list(series = name, share = share, trend = all_of(lowess(seq_along(x), x, f = share, iter = 0, delta = 0)$y))
}

lowess_trends <- list(nile = locally_smoothed("Nile", 0.5), lake = locally_smoothed("LakeHuron", 0.5))

# ARIMA at given constants, conditional sum of squares: residuals before the first that counts are zero ------------

times <- function(a, b) { # product of two polynomials in B, constant first
  product <- numeric(length(a) + length(b) - 1)
  for (i in seq_along(a)) product[i + seq_along(b) - 1] <- product[i + seq_along(b) - 1] + a[i] * b
  product
}

equivalent <- function(name, order, coefficients, seasonal = c(0, 0, 0), horizon = 6) {
  x <- series[[name]]
  m <- max(frequency(x), 2)
  fit <- arima(x, order = order, seasonal = list(order = seasonal, period = m), fixed = coefficients,
               transform.pars = FALSE, include.mean = FALSE, method = "CSS")
  ar <- coefficients[seq_len(order[1])]
  ma <- coefficients[order[1] + seq_len(order[3])]
  left <- c(1, -ar)
  for (i in seq_len(order[2])) left <- times(left, c(1, -1))
  if (seasonal[2] == 1) left <- times(left, c(1, numeric(m - 1), -1))
  y <- as.numeric(x)
  e <- c(residuals(fit), numeric(horizon))
  for (t in length(y) + seq_len(horizon)) # the difference equation, from the residuals above
    y[t] <- sum(-left[-1] * y[t - seq_along(left[-1])]) + sum(ma * e[t - seq_along(ma)])
  weights <- c(1, ARMAtoMA(-left[-1], ma, horizon - 1))
  list(series = name, order = all_of(order), seasonal = all_of(seasonal), coefficients = all_of(coefficients),
       residuals = all_of(residuals(fit)), forecast = all_of(tail(y, horizon)),
       forecast_exact_start = all_of(predict(fit, horizon)$pred), variance_by_lead = all_of(cumsum(weights^2)))
}

ma_of_winters <- function(alpha, beta, gamma, m) {
  # (1 - B)(1 - B^m) y = theta(B) e of the additive form; beta is the state-space coefficient,
  # gamma that of the season smoothed against the expected level
  c(alpha + beta - 1, rep(beta, m - 2), beta + gamma - 1, 1 - alpha - gamma)
}

arima_css <- list(
  ses_nile = equivalent("Nile", c(0, 1, 1), 0.3 - 1),
  ses_lakehuron = equivalent("LakeHuron", c(0, 1, 1), 0.9 - 1),
  holt_austres = equivalent("austres", c(0, 2, 2), c(0.8 + 0.8 * 0.25 - 2, 1 - 0.8)),
  damped_wwwusage = equivalent("WWWusage", c(1, 1, 2),
                               c(0.85, 0.9 + 0.85 * 0.9 * 0.6 - 1 - 0.85, 0.85 * (1 - 0.9))),
  changes_bjsales = equivalent("BJsales", c(0, 2, 1), 0.4 - 1),
  yearly_changes_gas = equivalent("UKgas", c(0, 1, 1), 0.35 - 1, seasonal = c(0, 1, 0), horizon = 9),
  additive_accidents = equivalent("USAccDeaths", c(0, 1, 13), ma_of_winters(0.5, 0.5 * 0.04, 0.3, 12),
                                  seasonal = c(0, 1, 0), horizon = 15)
)

best_ses <- function(name) {
  fit <- arima(series[[name]], order = c(0, 1, 1), method = "CSS", optim.control = list(reltol = 1e-14))
  list(series = name, theta = coef(fit)[[1]], sum_of_squares = sum(residuals(fit)^2))
}

arima_estimated <- list(nile = best_ses("Nile"), lake = best_ses("LakeHuron"), temperature = best_ses("nhtemp"),
                        tree = best_ses("treering"))

# Structural models by maximum likelihood ---------------------------------------------------------------------------

structural <- function(name, type, take_log = FALSE, fixed = NULL, horizon = 12) {
  x <- if (take_log) log10(series[[name]]) else series[[name]]
  fit <- StructTS(x, type = type, fixed = fixed, optim.control = list(maxit = 1000))
  if (fit$code != 0) stop("no convergence: ", name)
  filtered <- as.matrix(fitted(fit))
  list(series = name, log10 = take_log, season_length = frequency(x), variances = as.list(fit$coef),
       states = all_of(filtered[nrow(filtered), ]), forecast = all_of(predict(fit, horizon)$pred))
}

struct_ts <- list(
  level_nile = structural("Nile", "level"), level_lake = structural("LakeHuron", "level"),
  level_tree = structural("treering", "level"), level_temperature = structural("nhtemp", "level"),
  trend_austres = structural("austres", "trend", fixed = c(50, NA, 200)), # level and irregular given
  trend_wwwusage = structural("WWWusage", "trend", fixed = c(1, NA, 2)),
  trend_bjsales = structural("BJsales", "trend", fixed = c(1.4, NA, 1)),
  season_log_gas = structural("UKgas", "BSM", TRUE), season_log_airline = structural("AirPassengers", "BSM", TRUE)
)

# Portmanteau test ----------------------------------------------------------------------------------------------------

portmanteau <- function(name, lags) {
  found <- Box.test(diff(series[[name]]), lag = lags, type = "Ljung-Box")
  list(series = name, lags = lags, statistic = found$statistic[[1]], p = found$p.value)
}

ljung_box <- list(nile = portmanteau("Nile", 10), lake = portmanteau("LakeHuron", 10),
                  sales = portmanteau("BJsales", 10))

record <- list(
  source = "base R, packages stats and datasets: HoltWinters, stl, lowess, arima, StructTS, Box.test",
  made = paste0(format(Sys.Date()), ", ", R.version.string, ", ", R.version$platform,
                ": Rscript tests/references/r_reference.R; numbers with 13 digits"),
  series = lapply(series, function(x) list(n = length(x), sum = sum(x))),
  holt_winters = holt_winters, holt_winters_optimised = holt_winters_optimised, stl = decomposed,
  lowess = lowess_trends, arima_css = arima_css, arima_estimated = arima_estimated, struct_ts = struct_ts,
  ljung_box = ljung_box
)

here <- sub("^--file=", "", grep("^--file=", commandArgs(), value = TRUE))
writeLines(write_json(record), file.path(dirname(here), "r_reference.json"))
