//! Subcommands: arguments, wiring, what is printed. The only place with files and clock.
