// Package unit holds the quantities that every other package computes with.
//
// Each quantity is a type of its own over a base unit, so that adding grams to
// kilowatt-hours does not compile. Text is converted once, where it is read;
// sums are done in base units; people get three significant figures with the
// right prefix, programs get the exact number.
//
//	Mass       g CO2e     Intensity  g CO2e per kWh
//	Energy     kWh        Share      1 is 100 %
//	Joules     J          Duration   nanoseconds
//	Power      W          Instant    nanoseconds since 1970-01-01T00:00:00Z
//	Rate       g CO2e per amount of work in functional units
//
// Definitions: SI Brochure; NIST SP 811, Appendix B (1 kWh = 3.6e6 J,
// 1 lb = 0.45359237 kg, 1 short ton = 907.18474 kg, all exact). A year is
// 365 days, as in ISO/IEC 21031:2024.
package unit
