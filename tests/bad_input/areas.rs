//! Areas of neighbours that do not fit.

use crate::case::{Told, edited, one_problem, told};
use crate::shipped;

fn swirl(edits: &[(&str, &str)], told: &Told<'_>) {
    one_problem(&edited(&shipped("swirl_rig"), edits), &[], told);
}

const DUMP: &str = "[[element]]\nname             = \"dump\"\nkind             = \"expansion\"\neffective_length = \"10 mm\"\n\n";
const TUBE: &str = "[[element]]\nname     = \"mixing_tube\"\nkind     = \"duct\"\nlength   = \"0.10 m\"\ndiameter = \"30 mm\"\n\n";

#[test]
fn areas_that_do_not_fit() {
    // A flame between two areas.
    swirl(
        &[
            (DUMP, ""),
            ("diameter = \"80 mm\"", "diameter = ¦\"80 mm\"¦"),
        ],
        &told(
            "chamber.diameter",
            &[
                "`chamber` is 80 mm wide",
                "`mixing_tube`",
                "30 mm",
                "the flame `main_flame`",
            ],
            &["kind = \"expansion\""],
        ),
    );
    // Duct to duct.
    let second = "[[element]]\nname = \"more\"\nkind = \"duct\"\nlength = \"1 m\"\narea = ¦\"50 cm^2\"¦\n\n[exit]";
    swirl(
        &[("[exit]", second)],
        &told(
            "more.area",
            &[
                "`more` is 50 cm^2",
                "`chamber`",
                "80 mm wide",
                "no area change",
            ],
            &["kind = \"contraction\""],
        ),
    );
    // One area between two area changes fits neither.
    for (new, does) in [("130 mm", "widens"), ("100 mm", "leaves the area as it is")] {
        let new = format!("diameter = ¦\"{new}\"¦");
        swirl(
            &[("diameter = \"30 mm\"", &new)],
            &told(
                "mixing_tube.diameter",
                &[
                    "contraction `nozzle_in`",
                    does,
                    "expansion `dump`",
                    "narrows",
                ],
                &["correct this area"],
            ),
        );
    }
    // One area change goes the wrong way.
    let name = (
        "name             = \"dump\"",
        "name             = ¦\"dump\"¦",
    );
    swirl(
        &[("diameter = \"80 mm\"", "diameter = \"20 mm\""), name],
        &told(
            "dump",
            &["this expansion narrows", "30 mm", "20 mm"],
            &["kind = \"contraction\""],
        ),
    );
    swirl(
        &[("diameter = \"80 mm\"", "diameter = \"30 mm\""), name],
        &told(
            "dump",
            &["leaves the area as it is"],
            &["an expansion widens"],
        ),
    );
    let first = (
        "name             = \"nozzle_in\"",
        "name             = ¦\"nozzle_in\"¦",
    );
    swirl(
        &[first, ("diameter = \"100 mm\"", "diameter = \"20 mm\"")],
        &told(
            "nozzle_in",
            &["this contraction widens", "20 mm", "30 mm"],
            &["kind = \"expansion\""],
        ),
    );
    // Two area changes side by side say no area between them.
    swirl(
        &[first, (TUBE, ""), ("mixing_tube.out", "plenum.out")],
        &told(
            "nozzle_in",
            &["no duct stands between `nozzle_in` and `dump`"],
            &["put a duct between"],
        ),
    );
    // A throat as wide as what leads to it.
    swirl(
        &[
            ("pressure    = \"101325 Pa\"\n", ""),
            (
                "end = \"open\"",
                "end = \"choked\"\nthroat_diameter = ¦\"80 mm\"¦",
            ),
        ],
        &told(
            "exit.throat_diameter",
            &["the throat is 80 mm wide, not narrower"],
            &["narrower than its inlet"],
        ),
    );
}
