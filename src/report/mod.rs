//!
<<<<<<< HEAD

pub mod problems;
=======
>>>>>>> draw
