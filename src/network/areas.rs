//! Areas at the stations: stated by ducts, passed on by elements without an area of their own.
