//! A folder of outputs that appears whole or not at all.

use std::collections::HashSet;
use std::fs::{self, File};
use std::io::{self, Write};
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::SystemTime;

use tempfile::NamedTempFile;

use super::{AudioError, interrupt};

/// Outputs that have been found possible; nothing has been made yet.
#[derive(Debug)]
pub struct OutputPlan {
    folder: PathBuf,
    files: Vec<PathBuf>,
}

impl OutputPlan {
    /// Looks whether `files`, names below `folder`, can be written without harm. Makes nothing.
    ///
    /// # Errors
    /// The folder is a file, or holds something and `replace` is not set; an output is one of `inputs`, a folder, or
    /// named twice.
    pub fn check(folder: &Path, replace: bool, files: &[PathBuf], inputs: &[PathBuf]) -> Result<Self, AudioError> {
        let folder = if folder.as_os_str().is_empty() { Path::new(".") } else { folder };
        if folder.exists() && !folder.is_dir() {
            return Err(AudioError::FolderIsFile { folder: folder.to_owned() });
        }
        if folder.is_dir() && !replace {
            let mut entries = fs::read_dir(folder).map_err(AudioError::open(folder))?;
            if let Some(entry) = entries.next() {
                let holds = entry.map_err(AudioError::open(folder))?.file_name().into();
                return Err(AudioError::FolderInUse { folder: folder.to_owned(), holds });
            }
        }
        let mut seen = HashSet::new();
        for file in files {
            let path = folder.join(file);
            if !seen.insert(file) {
                return Err(AudioError::OutputTwice { path });
            }
            if path.is_dir() {
                return Err(AudioError::OutputIsFolder { path });
            }
            if inputs.iter().any(|input| same_file(input, &path)) {
                return Err(AudioError::OutputIsInput { path });
            }
        }
        Ok(OutputPlan { folder: folder.to_owned(), files: files.to_vec() })
    }

    /// The same for one file of any place: one that exists is refused unless `replace` is set.
    ///
    /// # Errors
    /// The file exists and `replace` is not set, is one of `inputs`, or a folder; its folder is a file.
    pub fn check_file(file: &Path, replace: bool, inputs: &[PathBuf]) -> Result<(Self, PathBuf), AudioError> {
        let Some(name) = file.file_name().map(PathBuf::from) else {
            return Err(AudioError::OutputIsFolder { path: file.to_owned() });
        };
        let plan = Self::check(file.parent().unwrap_or(Path::new("")), true, std::slice::from_ref(&name), inputs)?;
        if !replace && file.symlink_metadata().is_ok() {
            return Err(AudioError::FileExists { path: file.to_owned() });
        }
        Ok((plan, name))
    }

    /// Where the outputs will stand.
    pub fn targets(&self) -> impl Iterator<Item = PathBuf> {
        self.files.iter().map(|file| self.folder.join(file))
    }

    /// Makes the folder, and folders within it that outputs need.
    ///
    /// # Errors
    /// A folder cannot be made.
    pub fn create(self) -> Result<OutputFolder, AudioError> {
        let mut made = MadeFolders(Vec::new());
        made.make(&self.folder)?;
        for file in &self.files {
            if let Some(parent) = self.folder.join(file).parent() {
                made.make(parent)?;
            }
        }
        Ok(OutputFolder { folder: self.folder, files: self.files, made: Arc::new(made) })
    }
}

/// Whether both paths lead to one file, by links or otherwise.
fn same_file(a: &Path, b: &Path) -> bool {
    #[cfg(unix)]
    if let (Ok(a), Ok(b)) = (fs::metadata(a), fs::metadata(b)) {
        use std::os::unix::fs::MetadataExt;
        return (a.dev(), a.ino()) == (b.dev(), b.ino());
    }
    matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b)
}

/// Folders that were not there before. Those still empty at the end are removed again.
#[derive(Debug)]
struct MadeFolders(Vec<PathBuf>);

impl MadeFolders {
    fn make(&mut self, folder: &Path) -> Result<(), AudioError> {
        let missing: Vec<&Path> =
            folder.ancestors().take_while(|path| !path.as_os_str().is_empty() && !path.exists()).collect();
        for path in missing.into_iter().rev() {
            fs::create_dir(path).map_err(AudioError::write(path))?;
            self.0.push(path.to_owned());
        }
        Ok(())
    }
}

impl Drop for MadeFolders {
    fn drop(&mut self) {
        for folder in self.0.iter().rev() {
            // Fails, as it should, where the folder holds something.
            let _ = fs::remove_dir(folder);
        }
    }
}

/// The output folder of one run, and the outputs that were announced for it.
#[derive(Debug)]
pub struct OutputFolder {
    folder: PathBuf,
    files: Vec<PathBuf>,
    made: Arc<MadeFolders>,
}

impl OutputFolder {
    /// The folder itself.
    pub fn path(&self) -> &Path {
        &self.folder
    }

    /// An empty temporary that will become `name`, one of the files announced.
    ///
    /// # Panics
    /// If `name` was not announced to [`OutputPlan::check`].
    ///
    /// # Errors
    /// The temporary cannot be made.
    pub fn stage(&self, name: impl AsRef<Path>) -> Result<StagedFile, AudioError> {
        let name = name.as_ref();
        assert!(self.files.iter().any(|file| file == name), "{} was not checked beforehand", name.display());
        let target = self.folder.join(name);
        let parent = target.parent().unwrap_or(&self.folder);
        let mut builder = tempfile::Builder::new();
        builder.prefix(".platewright-").suffix(".part");
        #[cfg(unix)]
        {
            use std::os::unix::fs::PermissionsExt;
            // Of these the system takes the umask's bits away, as from any new file.
            builder.permissions(fs::Permissions::from_mode(0o666));
        }
        let temporary = builder.tempfile_in(parent).map_err(AudioError::write(&target))?;
        Ok(StagedFile { temporary, target, _made: Arc::clone(&self.made) })
    }

    /// Stages a small file with all its contents.
    ///
    /// # Panics
    /// If `name` was not announced to [`OutputPlan::check`].
    ///
    /// # Errors
    /// The temporary cannot be made or written.
    pub fn stage_contents(&self, name: impl AsRef<Path>, contents: &[u8]) -> Result<StagedFile, AudioError> {
        let mut staged = self.stage(name)?;
        staged.write_all(contents).map_err(AudioError::write(&staged.target))?;
        Ok(staged)
    }

    /// Puts all staged files in place, in this order, once every one of them is safe on the disk. Returns their paths.
    ///
    /// # Errors
    /// The disk is full or fails, or the user interrupts: then no output is in place, unless renaming within a folder
    /// itself fails half way.
    pub fn commit(self, staged: Vec<StagedFile>) -> Result<Vec<PathBuf>, AudioError> {
        for file in &staged {
            file.temporary.as_file().sync_all().map_err(AudioError::write(&file.target))?;
            if file.target.is_dir() {
                return Err(AudioError::OutputIsFolder { path: file.target.clone() });
            }
        }
        interrupt::check()?;
        let mut paths = Vec::new();
        for file in staged {
            let StagedFile { temporary, target, .. } = file;
            temporary.persist(&target).map_err(|error| AudioError::write(&target)(error.error))?;
            paths.push(target);
        }
        sync_folders(&paths)?;
        Ok(paths)
    }
}

/// Makes the new names themselves safe; on Windows a folder cannot be opened for that, nor need it be.
fn sync_folders(paths: &[PathBuf]) -> Result<(), AudioError> {
    let folders: HashSet<&Path> = paths.iter().filter_map(|path| path.parent()).collect();
    for folder in folders.into_iter().filter(|_| cfg!(unix)) {
        File::open(folder).and_then(|folder| folder.sync_all()).map_err(AudioError::write(folder))?;
    }
    Ok(())
}

/// An output that is not in place yet. Dropped, it leaves nothing behind.
#[derive(Debug)]
pub struct StagedFile {
    temporary: NamedTempFile,
    target: PathBuf,
    /// Removes the folders made for it, after the last temporary in them is gone.
    _made: Arc<MadeFolders>,
}

impl StagedFile {
    /// Where the file will stand.
    pub fn target(&self) -> &Path {
        &self.target
    }

    /// Gives the file another time of last change; to be called after the last byte.
    ///
    /// # Errors
    /// The system refuses.
    pub fn set_modified(&self, time: SystemTime) -> Result<(), AudioError> {
        self.temporary.as_file().set_modified(time).map_err(AudioError::write(&self.target))
    }
}

impl Write for StagedFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.temporary.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.temporary.flush()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(names: &[&str]) -> Vec<PathBuf> {
        names.iter().map(PathBuf::from).collect()
    }

    fn entries(folder: &Path) -> Vec<String> {
        let mut entries: Vec<String> =
            fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
        entries.sort();
        entries
    }

    #[test]
    fn outputs_appear_together_and_only_at_the_end() {
        let home = tempfile::tempdir().unwrap();
        let into = home.path().join("a/out");
        let plan = OutputPlan::check(&into, false, &names(&["x.wav", "take/y.json"]), &[]).unwrap();
        assert_eq!(entries(home.path()), [""; 0], "checking makes nothing");
        let folder = plan.create().unwrap();
        let first = folder.stage_contents("x.wav", b"sound").unwrap();
        let second = folder.stage_contents("take/y.json", b"{}").unwrap();
        assert!(!into.join("x.wav").exists() && !into.join("take/y.json").exists());
        let written = folder.commit(vec![first, second]).unwrap();
        assert_eq!(written, [into.join("x.wav"), into.join("take/y.json")]);
        assert_eq!(entries(&into), ["take", "x.wav"]);
        assert_eq!(entries(&into.join("take")), ["y.json"]);
        assert_eq!(fs::read(into.join("x.wav")).unwrap(), b"sound");
    }

    #[test]
    fn work_given_up_leaves_nothing_in_whatever_order_it_is_dropped() {
        let home = tempfile::tempdir().unwrap();
        let into = home.path().join("a/out");
        for folder_first in [true, false] {
            let plan = OutputPlan::check(&into, false, &names(&["take/x.wav"]), &[]).unwrap();
            let folder = plan.create().unwrap();
            let staged = folder.stage_contents("take/x.wav", b"half").unwrap();
            if folder_first {
                drop(folder);
                drop(staged);
            } else {
                drop(staged);
                drop(folder);
            }
            assert_eq!(entries(home.path()), [""; 0]);
        }
    }

    #[test]
    fn folder_that_holds_something_is_refused_unless_replacing() {
        let home = tempfile::tempdir().unwrap();
        fs::write(home.path().join("notes.txt"), "mine").unwrap();
        fs::write(home.path().join("x.wav"), "old").unwrap();
        let files = names(&["x.wav"]);
        let refused = OutputPlan::check(home.path(), false, &files, &[]).unwrap_err();
        assert!(matches!(refused, AudioError::FolderInUse { .. }) && refused.is_request(), "{refused}");
        let folder = OutputPlan::check(home.path(), true, &files, &[]).unwrap().create().unwrap();
        let staged = folder.stage_contents("x.wav", b"new").unwrap();
        assert_eq!(
            fs::read(home.path().join("x.wav")).unwrap(),
            b"old",
            "the old file stays until the new one is whole"
        );
        folder.commit(vec![staged]).unwrap();
        assert_eq!(fs::read(home.path().join("x.wav")).unwrap(), b"new");
        assert_eq!(entries(home.path()), ["notes.txt", "x.wav"]);
    }

    #[test]
    fn output_that_is_an_input_a_folder_or_twice_there_is_refused() {
        let home = tempfile::tempdir().unwrap();
        let take = home.path().join("take.wav");
        fs::write(&take, "sound").unwrap();
        fs::create_dir(home.path().join("taken")).unwrap();
        let check = |into: &Path, files: &[&str], input: &Path| {
            OutputPlan::check(into, true, &names(files), &[input.to_owned()]).unwrap_err()
        };
        let roundabout = home.path().join("taken/../take.wav");
        assert!(matches!(check(home.path(), &["take.wav"], &roundabout), AudioError::OutputIsInput { .. }));
        assert!(matches!(check(home.path(), &["taken"], &take), AudioError::OutputIsFolder { .. }));
        assert!(matches!(check(home.path(), &["x", "x"], &take), AudioError::OutputTwice { .. }));
        assert!(matches!(check(&take, &["x"], &roundabout), AudioError::FolderIsFile { .. }));
        #[cfg(unix)]
        {
            fs::hard_link(&take, home.path().join("link.wav")).unwrap();
            assert!(matches!(check(home.path(), &["link.wav"], &take), AudioError::OutputIsInput { .. }));
        }
    }

    #[cfg(unix)]
    #[test]
    fn outputs_get_the_permissions_of_any_new_file() {
        use std::os::unix::fs::PermissionsExt;
        let home = tempfile::tempdir().unwrap();
        let plain = home.path().join("plain");
        File::create(&plain).unwrap();
        let folder = OutputPlan::check(home.path(), true, &names(&["x"]), &[]).unwrap().create().unwrap();
        let staged = folder.stage("x").unwrap();
        let written = folder.commit(vec![staged]).unwrap();
        let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
        assert_eq!(mode(&written[0]), mode(&plain));
    }

    #[cfg(unix)]
    #[test]
    fn folder_that_cannot_be_made_says_so() {
        let refused = OutputPlan::check(Path::new("/dev/null/out"), false, &names(&["x"]), &[]);
        let error = refused.and_then(OutputPlan::create).unwrap_err();
        assert!(error.to_string().contains("/dev/null/out"), "{error}");
    }
}
