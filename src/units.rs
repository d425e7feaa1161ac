//! Text with a unit, such as "35 um", to SI and back: the only place that knows prefixes.
