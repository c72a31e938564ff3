// Package data reads what was measured and hands it on checked: supernovae, BAO ratios, ages of old objects,
// expansion rates, their covariance matrices and templates of systematic errors. It knows no cosmology.
//
// These are the first steps of the path of a number:
//
//  1. [Decompress] unpacks gzip, the table's separator and header row are found, comments are skipped.
//  2. The caller's [Options] say which of the file's columns carries which quantity. Nothing is guessed: a
//     missing column is an error that names the nearest one. [Recognise] proposes a mapping, for a person to
//     confirm.
//  3. A cut, written in the file's own column names, decides which rows stay. [Selection] remembers their
//     places in the file and how many rows every condition removed.
//  4. The cells of the rows kept become numbers, each checked for what it must be (a redshift above 0, an error
//     above 0). Cells that are not used are not looked at.
//  5. [ReadMatrix] reads a matrix, checks its symmetry on the way in, and [Factorised] cuts it with the rows and
//     proves it positive definite by its Cholesky factor.
//
// What comes out ([Supernovae], [BAO], [Ages], [Rates] and a covariance) is what package likelihood makes a term
// of the posterior from.
//
// # Tables
//
// A table has a header row and cells separated by commas, semicolons, tabs or blanks, whichever makes header and
// first row agree. Cells may be quoted. Lines that start with # are comments; as some public tables write their
// header as a comment, one that stands directly before the first row, with exactly as many fields, serves as
// header when that row looks like numbers. A byte-order mark, CRLF and gzip are fine.
//
//	supernovae   z, mu or mag; optional mu_err or mag_err, z_hel, name, survey
//	BAO          z, quantity, value; optional error
//	ages         z, age, error; optional name, bound (measured or lower)
//	rates        z, H, error
//
// Redshifts, errors, ages, rates and BAO values are above 0, z_hel is above -1, and every number is finite.
// Ages are in Gyr, rates in km/s/Mpc, mu and mag in magnitudes.
//
// # Errors
//
// Whatever is wrong with a file is an [*Error]: one line with the file, the line and the column, what was found,
// what was expected and what to do. Where a cut is to blame, which the caller wrote, it comes in a [*CutError]. Only a
// failing reader returns an error of another type.
package data
