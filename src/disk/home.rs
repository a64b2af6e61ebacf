//! Where tube types and records are sought: home on disk, or the demo types compiled in.
//! Must not parse what it reads.
//! Main types: [`Home`], [`TypeTexts`]; main function: [`demo_bench`].

use std::path::{Path, PathBuf};

use super::{DiskError, name::is_folder_name};

/// A tube type: (name, `limits.toml`, `recipe.toml`).
type Compiled = (&'static str, &'static str, &'static str);

/// The types that the program brings with it, read-only.
const COMPILED: &[Compiled] = &[
    ("open-500", include_str!("../../limits/open-500/limits.toml"), include_str!("../../limits/open-500/recipe.toml")),
    ("open-800", include_str!("../../limits/open-800/limits.toml"), include_str!("../../limits/open-800/recipe.toml")),
    (
        "plate-250",
        include_str!("../../limits/plate-250/limits.toml"),
        include_str!("../../limits/plate-250/recipe.toml"),
    ),
    ("quad-375", include_str!("../../limits/quad-375/limits.toml"), include_str!("../../limits/quad-375/recipe.toml")),
    ("twin-150", include_str!("../../limits/twin-150/limits.toml"), include_str!("../../limits/twin-150/recipe.toml")),
];

/// The station files that the program brings with it: (name of the bench, text).
const BENCHES: &[(&str, &str)] = &[
    ("bench-1", include_str!("../../fixtures/demo/bench-1.toml")),
    ("bench-2", include_str!("../../fixtures/demo/bench-2.toml")),
];

/// Text of the compiled-in station file of a demo bench.
pub fn demo_bench(name: &str) -> Option<&'static str> {
    BENCHES.iter().find(|(known, _)| *known == name).map(|(_, text)| *text)
}

/// Text of the checks of reference tubes that come with the demo scenario.
pub fn demo_checks() -> &'static str {
    include_str!("../../fixtures/demo/checks.toml")
}

/// The two files of a tube type, with the names that faults and records give them.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct TypeTexts {
    /// Name shown for the limits file.
    pub limits_name: String,
    /// Its text.
    pub limits: String,
    /// Name shown for the recipe file.
    pub recipe_name: String,
    /// Its text.
    pub recipe: String,
}

/// Where types are read and records go.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Home {
    folder: Option<PathBuf>,
    reports: PathBuf,
}

impl Home {
    /// Finds home: `--home`, else `TUBEWRIGHT_HOME`, else the nearest parent with `limits/`, else the types compiled in and
    /// records in the current folder.
    ///
    /// * `named`: what `--home` or the environment gave.
    /// * `reports`: what `--reports` gave; it wins over home's own.
    /// * `current`: current folder.
    pub fn find(named: Option<PathBuf>, reports: Option<PathBuf>, current: &Path) -> Self {
        let nearest = || current.ancestors().find(|folder| folder.join("limits").is_dir()).map(Path::to_owned);
        let folder = named.or_else(nearest);
        let reports = reports.unwrap_or_else(|| folder.as_deref().unwrap_or(current).join("reports"));
        Self { folder, reports }
    }

    /// The folder of records.
    pub fn reports(&self) -> &Path {
        &self.reports
    }

    /// The folder itself, where it is not the types compiled in.
    pub fn folder(&self) -> Option<&Path> {
        self.folder.as_deref()
    }

    /// Names of the types there are, sorted.
    pub fn types(&self) -> Result<Vec<String>, DiskError> {
        let Some(folder) = &self.folder else {
            return Ok(COMPILED.iter().map(|(name, ..)| (*name).to_owned()).collect());
        };
        let limits = folder.join("limits");
        let mut names = Vec::new();
        for entry in std::fs::read_dir(&limits).map_err(DiskError::io("read the folder", &limits))? {
            let entry = entry.map_err(DiskError::io("read the folder", &limits))?;
            let name = entry.file_name().into_string().unwrap_or_default();
            if is_folder_name(&name) && entry.path().join("limits.toml").is_file() {
                names.push(name);
            }
        }
        names.sort();
        Ok(names)
    }

    /// The files of a type; none if there is no such type. The name is compared, never used as a path unseen.
    pub fn read_type(&self, name: &str) -> Result<Option<TypeTexts>, DiskError> {
        if !self.types()?.iter().any(|known| known == name) {
            return Ok(None);
        }
        match &self.folder {
            None => Ok(COMPILED.iter().find(|(known, ..)| *known == name).map(|(name, limits, recipe)| TypeTexts {
                limits_name: format!("limits/{name}/limits.toml"),
                limits: (*limits).to_owned(),
                recipe_name: format!("limits/{name}/recipe.toml"),
                recipe: (*recipe).to_owned(),
            })),
            Some(folder) => {
                let read = |file: &str| -> Result<(String, String), DiskError> {
                    let path = folder.join("limits").join(name).join(file);
                    let text = std::fs::read_to_string(&path).map_err(DiskError::io("read", &path))?;
                    Ok((path.display().to_string(), text))
                };
                let (limits_name, limits) = read("limits.toml")?;
                let (recipe_name, recipe) = read("recipe.toml")?;
                Ok(Some(TypeTexts { limits_name, limits, recipe_name, recipe }))
            }
        }
    }
}
